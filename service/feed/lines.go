package feed

import (
	"bufio"
	"bytes"
	"errors"
	"io"
	"math"

	"beamward/closures/wire"
)

var nan = math.NaN()

// lineBuffer is the memory that a reader of lines takes: the longest line, and
// its end.
const lineBuffer = wire.MaxFactLine + 2

// lineReader cuts what it reads into lines. A line longer than
// wire.MaxFactLine is passed over whole and told as errLong, once.
type lineReader struct {
	r    *bufio.Reader
	long bool // within a line that is too long
}

func newLineReader(r io.Reader) *lineReader {
	return &lineReader{r: bufio.NewReaderSize(r, lineBuffer)}
}

var errLong = errors.New("longer than 65536 bytes: send one fact a line")

// next returns the next line without its end, LF or CR LF, good until the next
// call. What stands behind the last line end comes with the reader's error:
// whoever wrote it may not have finished.
func (l *lineReader) next() ([]byte, error) {
	for {
		line, err := l.r.ReadSlice('\n')
		switch {
		case err == nil && l.long:
			l.long = false // the end of it
		case err == nil:
			line = bytes.TrimSuffix(line[:len(line)-1], []byte{'\r'})
			if len(line) > wire.MaxFactLine {
				return line, errLong
			}
			return line, nil
		case errors.Is(err, bufio.ErrBufferFull) && l.long:
		case errors.Is(err, bufio.ErrBufferFull):
			l.long = true
			return line, errLong
		case l.long:
			return nil, err
		default:
			return bytes.TrimSuffix(line, []byte{'\r'}), err
		}
	}
}
