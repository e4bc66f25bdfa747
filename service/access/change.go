package access

import (
	"encoding/hex"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"time"

	"beamward/closures"
)

// TokenFile is the path of a token file. Its methods change the file whole and
// at once, one caller at a time, so that no change is lost and no reader sees
// half of one.
type TokenFile string

// Add makes a token for a name that has none and returns its secret, which is
// kept nowhere: show it once. A file that does not exist is made, with mode
// 0600.
func (f TokenFile) Add(name string, role Role, sources []closures.Source, at time.Time) (Secret, error) {
	secret := mint()
	digest := secret.digest()
	t := Token{Name: name, Role: role.String(), Sources: sources, Created: at.UTC().Truncate(time.Second), SHA256: hex.EncodeToString(digest[:])}
	if err := t.check(); err != nil {
		return Secret{}, fmt.Errorf("add token %.80q: %w", name, err)
	}
	err := f.change(true, func(tokens []Token) ([]Token, error) {
		for i := range tokens {
			if strings.EqualFold(tokens[i].Name, name) {
				return nil, fmt.Errorf("add token %s: %s has a token: revoke it first", name, tokens[i].Name)
			}
		}
		if len(tokens) >= maxTokens {
			return nil, fmt.Errorf("add token %s: there are %d already: revoke those that nobody uses", name, len(tokens))
		}
		return append(tokens, t), nil
	})
	if err != nil {
		return Secret{}, err
	}
	return secret, nil
}

// List returns the tokens in the order of their making.
func (f TokenFile) List() ([]Token, error) {
	b, err := readTokens(string(f))
	if err != nil {
		return nil, err
	}
	tokens, err := parseTokens(b)
	if err != nil {
		return nil, fmt.Errorf("read tokens %s: %w", string(f), err)
	}
	return tokens, nil
}

// Revoke takes the token of a name out of the file.
func (f TokenFile) Revoke(name string) error {
	return f.change(false, func(tokens []Token) ([]Token, error) {
		for i := range tokens {
			if tokens[i].Name == name {
				return append(tokens[:i:i], tokens[i+1:]...), nil
			}
		}
		return nil, fmt.Errorf("revoke token %.80q: nobody of that name has one: see the list of tokens", name)
	})
}

func (f TokenFile) change(create bool, edit func([]Token) ([]Token, error)) error {
	unlock, err := lock(string(f) + ".lock")
	if err != nil {
		return fmt.Errorf("change tokens %s: %w", string(f), err)
	}
	defer unlock()
	tokens, err := f.List()
	if err != nil && !(create && errors.Is(err, os.ErrNotExist)) {
		return err
	}
	if tokens, err = edit(tokens); err != nil {
		return err
	}
	b, err := formatTokens(tokens)
	if err != nil {
		return fmt.Errorf("change tokens %s: %w", string(f), err)
	}
	if err := replace(string(f), b); err != nil {
		return fmt.Errorf("change tokens %s: %w", string(f), err)
	}
	return nil
}

// replace puts a new file in the place of path, durably, or leaves path as it
// was.
func replace(path string, b []byte) error {
	if info, err := os.Lstat(path); err == nil && !info.Mode().IsRegular() {
		return errors.New("it is not a regular file")
	}
	dir := filepath.Dir(path)
	tmp, err := os.CreateTemp(dir, ".tokens-*") // made with mode 0600
	if err != nil {
		return err
	}
	_, err = tmp.Write(b)
	if err == nil {
		err = tmp.Sync()
	}
	if e := tmp.Close(); err == nil {
		err = e
	}
	if err == nil {
		err = os.Rename(tmp.Name(), path)
	}
	if err != nil {
		os.Remove(tmp.Name())
		return err
	}
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	defer d.Close()
	return d.Sync()
}
