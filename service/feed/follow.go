package feed

import (
	"context"
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"syscall"
	"time"
)

// follower reads what is appended to a file. A file that is there at the
// start is followed from its end, since what it holds is past; one that comes
// later, in its place or where none was, from its beginning. A file that was
// cut is followed from its beginning too.
type follower struct {
	path  string
	clock Clock
	desk  *desk

	// skip bounds how long a look may be late. What was written meanwhile is
	// then passed over, since when is not known. Zero: nothing is passed over.
	skip time.Duration

	begin func()                             // a reading begins anew
	line  func(text []byte, long bool) error // ends the run with its error

	file    *os.File
	at      int64
	cut     cutter
	looked  time.Duration
	started bool
}

// followEvery is how often the file is looked at in any case.
const followEvery = 250 * time.Millisecond

// run follows until ctx ends.
func (f *follower) run(ctx context.Context) error {
	f.desk.start()
	w := newWatch(filepath.Dir(f.path))
	defer w.close()
	return f.follow(ctx, w)
}

func (f *follower) follow(ctx context.Context, w *watch) error {
	defer f.close()
	f.looked = f.clock.Boot()
	for {
		if info, err := os.Stat(w.path); err == nil {
			w.follow(info)
		} else {
			w.gone()
		}
		if err := f.look(ctx); err != nil {
			return nil // only the end of ctx
		}
		f.started = true
		fired, stop := f.clock.Timer(followEvery)
		select {
		case <-fired:
		case <-w.news:
			stop()
		case <-ctx.Done():
			stop()
			return nil
		}
	}
}

func (f *follower) close() {
	if f.file != nil {
		f.file.Close()
		f.file = nil
		f.desk.open.Store(0)
	}
	f.cut.forget()
}

// look reads on. The error is that of line, or the end of ctx.
func (f *follower) look(ctx context.Context) error {
	now := f.clock.Boot()
	late := f.skip > 0 && now-f.looked > f.skip
	f.looked = now
	if late && f.file != nil {
		f.desk.notice("a file was not looked at for long: what was written meanwhile is passed over", "file", f.path)
		f.close()
		f.open(io.SeekEnd)
		return ctx.Err()
	}
	info, err := os.Stat(f.path)
	if f.file != nil {
		if err := f.read(ctx); err != nil {
			return err
		}
		if was, statErr := f.file.Stat(); statErr != nil || err == nil && !os.SameFile(was, info) {
			f.close() // another file has its name; this one was read to its end
		}
	}
	switch {
	case errors.Is(err, fs.ErrNotExist):
		f.trouble("the file is not there: it is followed as soon as it is")
	case err != nil:
		f.trouble("the file cannot be read: " + printable([]byte(err.Error()), 2*shownBytes))
	case f.file == nil:
		from := io.SeekStart
		if !f.started {
			from = io.SeekEnd
		}
		if f.open(from) {
			return f.read(ctx)
		}
	default:
		f.desk.setTrouble("")
	}
	return ctx.Err()
}

func (f *follower) trouble(why string) {
	if f.desk.setTrouble(why) {
		f.desk.notice("a file cannot be followed", "file", f.path, "what", why)
	}
}

func (f *follower) open(whence int) bool {
	file, err := os.OpenFile(f.path, os.O_RDONLY|syscall.O_NONBLOCK, 0)
	if err != nil {
		f.trouble("the file cannot be read: " + printable([]byte(err.Error()), 2*shownBytes))
		return false
	}
	info, err := file.Stat()
	if err == nil && !info.Mode().IsRegular() {
		err = errors.New("it is no plain file")
	}
	if err == nil {
		f.at, err = file.Seek(0, whence)
	}
	if err != nil {
		file.Close()
		f.trouble("the file cannot be read: " + printable([]byte(err.Error()), 2*shownBytes))
		return false
	}
	f.file = file
	f.desk.setTrouble("")
	f.desk.open.Store(1)
	f.desk.connections.Add(1)
	f.begin()
	return true
}

// read reads to the present end.
func (f *follower) read(ctx context.Context) error {
	info, err := f.file.Stat()
	if err == nil && info.Size() < f.at {
		f.desk.notice("a file was cut: it is followed from its beginning", "file", f.path)
		f.at = 0
		_, err = f.file.Seek(0, io.SeekStart)
		f.cut.forget()
		f.begin()
	}
	var buf [1 << 15]byte
	for err == nil && ctx.Err() == nil {
		var n int
		n, err = f.file.Read(buf[:])
		f.at += int64(n)
		if err := f.cut.cut(buf[:n], f.line); err != nil {
			return err
		}
	}
	if err != nil && !errors.Is(err, io.EOF) {
		f.trouble("the file cannot be read: " + printable([]byte(err.Error()), 2*shownBytes))
	}
	return ctx.Err()
}
