//go:build !unix

package access

import (
	"errors"
	"io/fs"
)

func lock(string) (func(), error) {
	return nil, errors.New("tokens need a system with file locks and owners")
}

func ownFile(fs.FileInfo) error {
	return errors.New("tokens need a system with file locks and owners")
}
