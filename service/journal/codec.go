package journal

import (
	"encoding/binary"
	"errors"
	"fmt"
	"hash/crc32"

	"github.com/klauspost/compress/zstd"
)

// maxUnpacked bounds what a block or a text may grow to when it is
// decompressed, whatever the row says: 512 MiB.
const maxUnpacked = 512 << 20

// codec packs bytes as Zstandard followed by a CRC-32C of the packed bytes:
// some bits of a Zstandard frame carry nothing, and the CRC sees those flip
// too. It is safe for concurrent use.
type codec struct {
	enc *zstd.Encoder
	dec *zstd.Decoder
	crc *crc32.Table
}

func newCodec() (*codec, error) {
	enc, err := zstd.NewWriter(nil,
		zstd.WithEncoderConcurrency(1), zstd.WithEncoderLevel(zstd.SpeedDefault),
		zstd.WithWindowSize(1<<20), zstd.WithLowerEncoderMem(true))
	if err != nil {
		return nil, fmt.Errorf("preparing compression: %w", err)
	}
	dec, err := zstd.NewReader(nil,
		zstd.WithDecoderConcurrency(2), zstd.WithDecoderMaxMemory(maxUnpacked), zstd.WithDecoderLowmem(true))
	if err != nil {
		return nil, fmt.Errorf("preparing decompression: %w", err)
	}
	return &codec{enc: enc, dec: dec, crc: crc32.MakeTable(crc32.Castagnoli)}, nil
}

func (c *codec) close() {
	c.enc.Close()
	c.dec.Close()
}

func (c *codec) pack(plain []byte) []byte {
	b := c.enc.EncodeAll(plain, nil)
	return binary.BigEndian.AppendUint32(b, crc32.Checksum(b, c.crc))
}

var errPacked = errors.New("the packed bytes do not match their checksum")

// unpack gives size bytes or an error.
func (c *codec) unpack(b []byte, size int64) ([]byte, error) {
	if len(b) < crc32.Size {
		return nil, errPacked
	}
	z, sum := b[:len(b)-crc32.Size], b[len(b)-crc32.Size:]
	if crc32.Checksum(z, c.crc) != binary.BigEndian.Uint32(sum) {
		return nil, errPacked
	}
	plain, err := c.dec.DecodeAll(z, nil)
	if err != nil {
		return nil, fmt.Errorf("decompressing: %w", err)
	}
	if int64(len(plain)) != size {
		return nil, fmt.Errorf("decompressed to %d bytes instead of %d", len(plain), size)
	}
	return plain, nil
}
