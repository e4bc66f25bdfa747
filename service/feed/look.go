package feed

import (
	"cmp"
	"context"
	"errors"
	"io"
	"io/fs"
	"os"
	"slices"
	"strings"
	"time"

	"beamward/closures"
)

// entry is one file as it was last seen.
type entry struct {
	info   fs.FileInfo
	since  time.Duration // boot time since when it has not changed
	done   bool          // taken, or refused and left: nothing to do until it changes
	stuck  string        // why it was left, though refused
	digest [32]byte      // of the text that was taken; zero: none was
}

// same reports whether a file is untouched: the same one, of the same size and
// time of change.
func same(a, b fs.FileInfo) bool {
	return os.SameFile(a, b) && a.Size() == b.Size() && a.ModTime().Equal(b.ModTime()) && a.Mode() == b.Mode()
}

// candidate is a file that is ready to be read.
type candidate struct {
	name string
	*entry
	err error
}

// putOff is how soon a list that cannot be taken now is offered again.
const putOff = time.Second

// look goes through the folder once and returns when to do so again.
func (f *Folder) look(ctx context.Context, w *watch) (again time.Duration) {
	f.problem = ""
	defer func() { f.trouble(f.problem) }()
	root, info, err := f.openFolder()
	if err != nil {
		w.gone()
		f.seen(0, 0)
		f.problem = printable([]byte(err.Error()), 4*shownBytes)
		return min(f.options.Rescan, putOff)
	}
	defer root.Close()
	w.follow(info)
	list, err := listed(root)
	if err != nil {
		f.problem = printable([]byte(err.Error()), 4*shownBytes)
		return f.options.Rescan
	}
	ready, waiting := f.sort(list)
	f.seen(len(list), waiting+len(ready))
	if len(ready) > 0 {
		waiting += f.offerAll(ctx, root, ready)
		f.seen(len(list), waiting)
	}
	if waiting > 0 {
		return min(f.options.Rescan, f.options.Settle)
	}
	return f.options.Rescan
}

func (f *Folder) seen(files, waiting int) {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.stats.Files, f.stats.Waiting, f.stats.Looked = files, waiting, f.options.Clock.Wall()
}

// unfinished reports whether a name says that its file is still being written,
// or is not a list at all.
func unfinished(name string) bool {
	return strings.HasPrefix(name, ".") || strings.HasSuffix(name, ".part") || strings.HasSuffix(name, ".tmp") || strings.HasSuffix(name, "~")
}

// listed returns what lies in the folder, folders within left out.
func listed(root *os.Root) (map[string]fs.FileInfo, error) {
	dir, err := root.Open(".")
	if err != nil {
		return nil, err
	}
	defer dir.Close()
	all, err := dir.ReadDir(maxFiles + 1)
	if err != nil && !errors.Is(err, io.EOF) {
		return nil, err
	}
	if len(all) > maxFiles {
		return nil, errors.New("it holds more than 20000 files: take old ones out")
	}
	out := map[string]fs.FileInfo{}
	for _, d := range all {
		if d.IsDir() || unfinished(d.Name()) {
			continue
		}
		if info, err := root.Lstat(d.Name()); err == nil && !info.IsDir() { // else it is gone meanwhile
			out[d.Name()] = info
		}
	}
	return out, nil
}

// sort compares what lies there with what was known, and returns what is ready
// in the order in which it came.
func (f *Folder) sort(list map[string]fs.FileInfo) (ready []candidate, waiting int) {
	now := f.options.Clock.Boot()
	for name := range f.known {
		if _, there := list[name]; !there {
			delete(f.known, name)
		}
	}
	for name, info := range list {
		e := f.known[name]
		switch {
		case e == nil:
			e = &entry{info: info, since: now}
			f.known[name] = e
		case !same(e.info, info):
			e.info, e.since, e.done, e.stuck = info, now, false, ""
		}
		switch {
		case e.done:
			if e.stuck != "" {
				f.problem = e.stuck
			}
		case now-e.since >= f.options.Settle:
			ready = append(ready, candidate{name: name, entry: e})
		default:
			waiting++
		}
	}
	slices.SortFunc(ready, func(a, b candidate) int {
		return cmp.Or(a.info.ModTime().Compare(b.info.ModTime()), cmp.Compare(a.name, b.name))
	})
	return ready, waiting
}

// offerAll offers what is ready and returns how many of it wait on. A list may
// rest on another that came with it, so what is refused for want of another is
// offered again as long as any was taken.
func (f *Folder) offerAll(ctx context.Context, root *os.Root, ready []candidate) (waiting int) {
	for again := true; again && len(ready) > 0; {
		again = false
		left := ready[:0]
		for _, c := range ready {
			if ctx.Err() != nil {
				return len(ready)
			}
			taken, err := f.offer(ctx, root, &c)
			switch {
			case taken:
				again = true
			case err != nil && restsOnAnother(err):
				c.err = err
				left = append(left, c)
			case err != nil:
				f.refuse(root, &c, err)
			case !c.done:
				c.since = f.options.Clock.Boot() // put off
				waiting++
			}
		}
		ready = left
	}
	for i := range ready {
		f.refuse(root, &ready[i], ready[i].err)
	}
	return waiting
}

// restsOnAnother reports whether a list was refused for what others there are.
func restsOnAnother(err error) bool {
	var e *closures.Error
	return errors.As(err, &e) && (e.Code == closures.NotFound || e.Code == closures.Conflict)
}

// later reports whether a list that was not taken may be taken later as it is.
func later(err error) bool {
	var e *closures.Error
	return errors.As(err, &e) && (e.Code == closures.Busy || e.Code == closures.Internal) ||
		errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded)
}
