package feed

import (
	"io/fs"
	"os"
	"sync"

	"github.com/fsnotify/fsnotify"
)

// watch says when something happened in a folder. It is a hint that makes
// looking quicker: files are also looked at by the clock, since a watch can
// fail, be out of reach of a network's file system, or follow a folder that
// was moved away.
type watch struct {
	path string
	news chan struct{} // holds one
	w    *fsnotify.Watcher
	dir  fs.FileInfo // that is watched; nil: none
	all  sync.WaitGroup
}

func newWatch(path string) *watch {
	w := &watch{path: path, news: make(chan struct{}, 1)}
	inner, err := fsnotify.NewWatcher()
	if err != nil {
		return w // the clock alone will do
	}
	w.w = inner
	w.all.Go(func() {
		for {
			select {
			case _, open := <-inner.Events:
				if !open {
					return
				}
			case _, open := <-inner.Errors: // such as events lost: look
				if !open {
					return
				}
			}
			select {
			case w.news <- struct{}{}:
			default:
			}
		}
	})
	return w
}

// follow watches the folder that stands there now, if it is not the one
// watched already: a folder made anew is another one.
func (w *watch) follow(info fs.FileInfo) {
	if w.w == nil || w.dir != nil && os.SameFile(w.dir, info) {
		return
	}
	_ = w.w.Remove(w.path) // it may be gone by itself
	if w.w.Add(w.path) == nil {
		w.dir = info
	}
}

// gone forgets the folder.
func (w *watch) gone() {
	if w.w != nil && w.dir != nil {
		_ = w.w.Remove(w.path)
		w.dir = nil
	}
}

func (w *watch) close() {
	if w.w != nil {
		_ = w.w.Close()
	}
	w.all.Wait()
}
