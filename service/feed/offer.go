package feed

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"hash"
	"io"
	"io/fs"
	"os"
	"syscall"
)

var (
	errNotPlain = errors.New("it is a link or no plain file: copy the list itself here")
	errTooLarge = errors.New("it is larger than 256 MiB: split the list")
	errChanged  = errors.New("the file changed while it was read")
)

// offer reads one file and offers it. Neither taken nor an error: it is as it
// was, or to be tried again.
func (f *Folder) offer(ctx context.Context, root *os.Root, c *candidate) (taken bool, _ error) {
	switch {
	case !c.info.Mode().IsRegular():
		return false, errNotPlain
	case c.info.Size() > maxListBytes:
		return false, errTooLarge
	}
	// A pipe put in its place meanwhile must not stop the watch.
	file, err := root.OpenFile(c.name, os.O_RDONLY|syscall.O_NONBLOCK, 0)
	if err != nil {
		f.cannotRead(c, err)
		return false, nil
	}
	defer file.Close()
	if !untouched(file, c.info) {
		return false, nil // the next look sees it
	}
	digest, err := digestOf(file)
	if err != nil {
		f.cannotRead(c, err)
		return false, nil
	}
	if digest == c.digest {
		c.done = true // touched, not changed
		return false, nil
	}
	text := &wholeText{r: io.LimitReader(file, c.info.Size()), sum: sha256.New(), want: digest,
		still: func() bool { return untouched(file, c.info) && inPlace(root, c.name, c.info) }}
	err = f.options.Offer(ctx, f.options.Authority, c.name, text)
	switch {
	case text.err != nil && !errors.Is(text.err, io.EOF):
		f.cannotRead(c, text.err)
		return false, nil
	case err == nil:
		c.done, c.digest = true, digest
		f.take(c.name)
		return true, nil
	case later(err):
		f.notice("a closure list is put off", "authority", f.options.Authority, "file", shown([]byte(c.name)), "cause", printable([]byte(err.Error()), 4*shownBytes))
		return false, nil
	}
	return false, err
}

func (f *Folder) cannotRead(c *candidate, err error) {
	f.problem = "a file cannot be read now: " + printable([]byte(c.name), shownBytes) + ": " + printable([]byte(err.Error()), 2*shownBytes)
}

func (f *Folder) take(name string) {
	f.mu.Lock()
	f.stats.Taken++
	f.stats.LastTaken = f.options.Clock.Wall()
	f.mu.Unlock()
	f.notice("a closure list is taken", "authority", f.options.Authority, "file", printable([]byte(name), shownBytes))
}

func untouched(file *os.File, info fs.FileInfo) bool {
	now, err := file.Stat()
	return err == nil && same(now, info)
}

func inPlace(root *os.Root, name string, info fs.FileInfo) bool {
	now, err := root.Lstat(name)
	return err == nil && same(now, info)
}

func digestOf(file *os.File) (out [32]byte, err error) {
	h := sha256.New()
	if _, err := io.Copy(h, io.LimitReader(file, maxListBytes)); err != nil {
		return out, err
	}
	_, err = file.Seek(0, io.SeekStart)
	return [32]byte(h.Sum(nil)), err
}

// wholeText reads a file whose digest is known. It ends only when it gave what
// the digest was made of and the file was left alone all the while: whoever
// reads to the end has read one text, not the half of two.
type wholeText struct {
	r     io.Reader
	sum   hash.Hash
	want  [32]byte
	still func() bool
	err   error
}

// Read reads on.
func (w *wholeText) Read(p []byte) (int, error) {
	if w.err != nil {
		return 0, w.err
	}
	n, err := w.r.Read(p)
	w.sum.Write(p[:n])
	if errors.Is(err, io.EOF) {
		err = io.EOF
		if [32]byte(w.sum.Sum(nil)) != w.want || !w.still() {
			err = errChanged
		}
	} else if err != nil {
		err = fmt.Errorf("read the file: %w", err)
	}
	w.err = err
	return n, err
}
