package feed

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"sync"
	"time"

	"beamward/closures"
)

// FolderOptions are what a watched folder is made of. Times that are zero
// stand for their defaults.
type FolderOptions struct {
	Authority closures.AuthorityID
	Path      string
	// Offer takes in one closure list and says why not. It reads the text to
	// its end, which comes only if the file did not change meanwhile, and does
	// no harm when the same text is offered again. A *closures.Error of code
	// Busy or Internal means: try again later. Any other error, a *Refusal of
	// listfile above all, refuses the file.
	Offer  func(ctx context.Context, authority closures.AuthorityID, name string, text io.Reader) error
	Clock  Clock
	Notice Notice // nil: nobody is told

	Rescan time.Duration // how often the folder is looked at in any case: 10 s
	Settle time.Duration // how long a file must not have changed: 500 ms
}

// Folder offers the closure lists that an authority's folder holds.
//
// A file is read once nothing of it has changed for the time to settle.
// Whoever cannot write a list at once writes it under a name that begins with
// a dot, or ends in .part, .tmp or ~, and renames it. A file that was taken
// stays where it is and is known by its content. One that is refused is moved
// into the folder refused within, with the reason in a text beside it. Links
// and whatever else is no plain file are refused unread.
type Folder struct {
	options FolderOptions
	claims  *claims
	teller
	known   map[string]*entry
	problem string // found in the present look

	mu       sync.Mutex
	stats    FolderStats
	refusals []FileRefusal
}

// FolderStats is what a folder's watch has done since its start.
type FolderStats struct {
	Authority closures.AuthorityID
	Path      string
	Looked    time.Time // last; zero: never
	Trouble   string    // a caution: what keeps lists from being taken; empty: nothing
	Files     int       // lists that lie there
	Waiting   int       // of them, not settled yet or put off
	Taken     uint64
	Refused   uint64
	LastTaken time.Time
	Refusals  []FileRefusal // the last ones, oldest first
}

// FileRefusal is one file that was refused. Its text is printable ASCII.
type FileRefusal struct {
	At    time.Time
	Name  string
	Cause string
}

const (
	refusedFolder = "refused"
	maxFiles      = 20000     // in one folder
	maxListBytes  = 256 << 20 // of one file
)

// WatchFolders makes the watches of all authorities' folders and starts
// nothing. Two authorities cannot have one folder: whose list a file is could
// not be told.
func WatchFolders(all []FolderOptions) ([]*Folder, error) {
	shared := &claims{by: map[*Folder]fs.FileInfo{}}
	real := map[string]closures.AuthorityID{}
	var out []*Folder
	for _, o := range all {
		if o.Offer == nil || o.Clock == nil || o.Path == "" {
			return nil, fmt.Errorf("watching the folder of %s: it has no path, no clock or nobody to offer to", o.Authority)
		}
		if o.Rescan <= 0 {
			o.Rescan = 10 * time.Second
		}
		if o.Settle <= 0 {
			o.Settle = 500 * time.Millisecond
		}
		path := resolved(o.Path)
		for other, authority := range real {
			if path == other || path == filepath.Join(other, refusedFolder) || other == filepath.Join(path, refusedFolder) {
				return nil, fmt.Errorf("watching the folders: %s and %s have one folder, %s: give each authority its own", authority, o.Authority, o.Path)
			}
		}
		real[path] = o.Authority
		f := &Folder{options: o, claims: shared, known: map[string]*entry{}}
		f.teller.clock, f.teller.tell = o.Clock, o.Notice
		f.stats.Authority, f.stats.Path = o.Authority, o.Path
		out = append(out, f)
	}
	return out, nil
}

// resolved is the folder's path without links, as far as it exists.
func resolved(path string) string {
	if abs, err := filepath.Abs(path); err == nil {
		path = abs
	}
	if real, err := filepath.EvalSymlinks(path); err == nil {
		return real
	}
	return filepath.Clean(path)
}

// claims keeps two watches out of one folder that became one only later.
type claims struct {
	mu sync.Mutex
	by map[*Folder]fs.FileInfo
}

// claim says whose the folder is already; empty: f's now.
func (c *claims) claim(f *Folder, info fs.FileInfo) closures.AuthorityID {
	c.mu.Lock()
	defer c.mu.Unlock()
	for o, i := range c.by {
		if o != f && info != nil && os.SameFile(i, info) {
			return o.options.Authority
		}
	}
	if info == nil {
		delete(c.by, f)
	} else {
		c.by[f] = info
	}
	return ""
}

// Stats returns what the watch has done so far.
func (f *Folder) Stats() FolderStats {
	f.mu.Lock()
	defer f.mu.Unlock()
	s := f.stats
	s.Refusals = append([]FileRefusal(nil), f.refusals...)
	return s
}

// Run looks at the folder until ctx ends.
func (f *Folder) Run(ctx context.Context) error {
	w := newWatch(f.options.Path)
	defer w.close()
	return f.follow(ctx, w)
}

func (f *Folder) follow(ctx context.Context, w *watch) error {
	defer f.claims.claim(f, nil)
	for {
		pause := f.look(ctx, w)
		if ctx.Err() != nil {
			return nil
		}
		fired, stop := f.options.Clock.Timer(pause)
		select {
		case <-fired:
		case <-w.news:
			stop()
			// What follows the news, such as the rest of the file, comes soon.
			if sleep(ctx, f.options.Clock, newsPause) != nil {
				return nil
			}
		case <-ctx.Done():
			stop()
			return nil
		}
	}
}

// newsPause bounds how often news alone makes the folder be looked at.
const newsPause = 50 * time.Millisecond

// trouble states what keeps lists from being taken; empty: nothing.
func (f *Folder) trouble(why string) {
	f.mu.Lock()
	was := f.stats.Trouble
	f.stats.Trouble = why
	f.mu.Unlock()
	switch {
	case why == was:
	case why == "":
		f.notice("a folder of closure lists is as it should be again", "authority", f.options.Authority, "path", f.options.Path)
	default:
		f.notice("a folder of closure lists is in trouble", "authority", f.options.Authority, "path", f.options.Path, "what", why)
	}
}

// openFolder opens the folder, unless it is another authority's.
func (f *Folder) openFolder() (*os.Root, fs.FileInfo, error) {
	root, err := os.OpenRoot(f.options.Path)
	if err != nil {
		f.claims.claim(f, nil)
		if errors.Is(err, fs.ErrNotExist) {
			return nil, nil, errors.New("it is gone: lists that are in force stay so; make it again")
		}
		return nil, nil, fmt.Errorf("it cannot be opened: %w", err)
	}
	info, err := root.Stat(".")
	if err != nil {
		root.Close()
		return nil, nil, fmt.Errorf("it cannot be opened: %w", err)
	}
	if other := f.claims.claim(f, info); other != "" {
		root.Close()
		return nil, nil, fmt.Errorf("it is the folder of %s: give each authority its own", other)
	}
	return root, info, nil
}
