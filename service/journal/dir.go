package journal

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"golang.org/x/sys/unix"
)

// The files of a data_dir that are the journal's.
const (
	File     = "record.db" // with -wal and -shm beside it while it is open
	lockFile = "record.lock"
)

// prepareDir makes dir, or checks that nobody else can reach into it.
func prepareDir(dir string) error {
	if err := os.MkdirAll(dir, 0o700); err != nil {
		return fmt.Errorf("making data_dir %s: %w: choose a folder that this user can write", dir, bare(err))
	}
	info, err := os.Stat(dir)
	if err != nil {
		return fmt.Errorf("looking at data_dir %s: %w", dir, bare(err))
	}
	if info.Mode().Perm()&0o077 != 0 {
		return fmt.Errorf("data_dir %s is open to others (mode %04o): run chmod 700 %s", dir, info.Mode().Perm(), dir)
	}
	return nil
}

// prepareFile makes an empty file that only its owner can read, so that SQLite
// gives the files beside it the same mode. It refuses what is not a plain file.
func prepareFile(path string) error {
	info, err := os.Lstat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		f, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_RDWR, 0o600)
		if err != nil {
			return fmt.Errorf("making %s: %w: make the folder writable to this user", path, bare(err))
		}
		if err := errors.Join(f.Sync(), f.Close(), syncDir(filepath.Dir(path))); err != nil {
			return fmt.Errorf("making %s: %w", path, err)
		}
		return nil
	case err != nil:
		return fmt.Errorf("looking at %s: %w", path, bare(err))
	case !info.Mode().IsRegular():
		return fmt.Errorf("%s is not a plain file: move it away", path)
	}
	// A restored copy may come with a wider mode; the folder keeps others out
	// already.
	if info.Mode().Perm() != 0o600 {
		if err := os.Chmod(path, 0o600); err != nil {
			return fmt.Errorf("narrowing the mode of %s: %w: let this user own the file", path, bare(err))
		}
	}
	if err := unix.Access(path, unix.R_OK|unix.W_OK); err != nil {
		return fmt.Errorf("opening %s for writing: %w: make it writable to this user", path, err)
	}
	return nil
}

func syncDir(dir string) error {
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	return errors.Join(d.Sync(), d.Close())
}

// lock keeps a second service out of dir for as long as the file stays open;
// the kernel lets go of it when the process dies.
func lock(dir string) (*os.File, error) {
	path := filepath.Join(dir, lockFile)
	f, err := os.OpenFile(path, os.O_CREATE|os.O_RDWR, 0o600)
	if err != nil {
		return nil, fmt.Errorf("opening %s: %w: make the folder writable to this user", path, bare(err))
	}
	if err := unix.Flock(int(f.Fd()), unix.LOCK_EX|unix.LOCK_NB); err != nil {
		held := make([]byte, 20)
		n, _ := f.ReadAt(held, 0)
		_ = f.Close()
		if errors.Is(err, unix.EWOULDBLOCK) {
			who := strings.TrimSpace(string(held[:n]))
			return nil, fmt.Errorf("data_dir %s is in use by process %s: stop it, or choose another data_dir", dir, who)
		}
		return nil, fmt.Errorf("locking %s: %w", path, err)
	}
	// The number is for the message above only.
	_ = f.Truncate(0)
	_, _ = f.WriteAt(fmt.Appendf(nil, "%d\n", os.Getpid()), 0)
	return f, nil
}

// bare drops the operation and path that package os repeats.
func bare(err error) error {
	var p *fs.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	return err
}
