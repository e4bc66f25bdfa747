//go:build unix

package access

import (
	"errors"
	"io/fs"
	"os"
	"syscall"

	"golang.org/x/sys/unix"
)

// lock takes the file lock at path, waiting for whoever has it, and returns
// how to let it go. The kernel lets it go when the process ends.
func lock(path string) (unlock func(), err error) {
	f, err := os.OpenFile(path, os.O_CREATE|os.O_RDWR, 0o600)
	if err != nil {
		return nil, err
	}
	for {
		err = unix.Flock(int(f.Fd()), unix.LOCK_EX)
		if !errors.Is(err, unix.EINTR) {
			break
		}
	}
	if err != nil {
		f.Close()
		return nil, err
	}
	return func() { f.Close() }, nil
}

// ownFile wants the file to be this user's or root's: with mode 0600 nobody
// else can have written it then.
func ownFile(info fs.FileInfo) error {
	st, ok := info.Sys().(*syscall.Stat_t)
	if !ok || (int(st.Uid) != os.Geteuid() && st.Uid != 0) {
		return errors.New("it belongs to another user: make it the service's own")
	}
	return nil
}
