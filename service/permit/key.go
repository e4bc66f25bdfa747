package permit

import (
	"crypto/ed25519"
	"crypto/rand"
	"crypto/x509"
	"encoding/pem"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"beamward/closures/wire"
)

// KeyFile is the name of the key's file in data_dir: an Ed25519 private key in
// PKCS #8, as PEM.
const KeyFile = "permit-key.pem"

// pemType is the label of PKCS #8 (RFC 7468).
const pemType = "PRIVATE KEY"

// Key signs permits.
type Key struct {
	private   ed25519.PrivateKey
	id        string
	jwk       []byte
	throwAway bool
}

func newKey(private ed25519.PrivateKey, throwAway bool) *Key {
	public := private.Public().(ed25519.PublicKey)
	return &Key{private: private, id: wire.Thumbprint(public), jwk: wire.JWK(public), throwAway: throwAway}
}

// ThrowAway makes a key that is kept nowhere, for simulated permits.
func ThrowAway() (*Key, error) {
	_, private, err := ed25519.GenerateKey(rand.Reader)
	if err != nil {
		return nil, fmt.Errorf("making a permit key: %w", err)
	}
	return newKey(private, true), nil
}

// LoadKey reads the key in a folder, which it makes where there is none. It
// refuses a file that others may read and one that is not such a key: nothing
// is overwritten.
func LoadKey(dir string) (*Key, error) {
	path := filepath.Join(dir, KeyFile)
	k, err := readKey(path)
	if !errors.Is(err, fs.ErrNotExist) {
		return k, err
	}
	if err := makeKey(path); err != nil {
		return nil, fmt.Errorf("making the permit key: %w", err)
	}
	return readKey(path)
}

func readKey(path string) (*Key, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("reading the permit key: %w", err)
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return nil, fmt.Errorf("reading the permit key: %w", err)
	}
	if !info.Mode().IsRegular() || info.Mode().Perm()&0o077 != 0 {
		return nil, fmt.Errorf("reading the permit key %s: others may reach it: make it a file with mode 0600, or a new one if they might have read it", path)
	}
	if info.Size() > 4096 {
		return nil, notAKey(path)
	}
	text := make([]byte, info.Size())
	if n, err := f.ReadAt(text, 0); n < len(text) {
		return nil, fmt.Errorf("reading the permit key: %w", err)
	}
	block, rest := pem.Decode(text)
	if block == nil || block.Type != pemType || len(rest) != 0 {
		return nil, notAKey(path)
	}
	any, err := x509.ParsePKCS8PrivateKey(block.Bytes)
	private, ok := any.(ed25519.PrivateKey)
	if err != nil || !ok {
		return nil, notAKey(path)
	}
	return newKey(private, false), nil
}

func notAKey(path string) error {
	return fmt.Errorf("reading the permit key %s: it is not one Ed25519 key in PKCS #8 and PEM: put the right file back, or take it away to have a new one made", path)
}

// makeKey puts a new key at path, whole or not at all, and never over another.
func makeKey(path string) error {
	_, private, err := ed25519.GenerateKey(rand.Reader)
	if err != nil {
		return err
	}
	der, err := x509.MarshalPKCS8PrivateKey(private)
	if err != nil {
		return err
	}
	f, err := os.CreateTemp(filepath.Dir(path), "."+KeyFile+".*") // mode 0600
	if err != nil {
		return err
	}
	defer os.Remove(f.Name())
	_, err = f.Write(pem.EncodeToMemory(&pem.Block{Type: pemType, Bytes: der}))
	if err = errors.Join(err, f.Sync(), f.Close()); err != nil {
		return err
	}
	if err := os.Link(f.Name(), path); err != nil && !errors.Is(err, fs.ErrExist) {
		return err
	}
	dir, err := os.Open(filepath.Dir(path))
	if err != nil {
		return err
	}
	return errors.Join(dir.Sync(), dir.Close())
}

func (k *Key) sign(b []byte) []byte { return ed25519.Sign(k.private, b) }

// ID names the key: its thumbprint (RFC 7638).
func (k *Key) ID() string { return k.id }

// JWK returns the public part as a JSON Web Key (RFC 7517, 8037). The caller
// must not change it.
func (k *Key) JWK() []byte { return k.jwk }

// Public returns the public part.
func (k *Key) Public() ed25519.PublicKey { return k.private.Public().(ed25519.PublicKey) }
