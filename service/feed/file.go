package feed

import (
	"context"
	"errors"
	"fmt"
)

// FileOptions are what a feed of facts from a file is made of.
type FileOptions struct {
	Options
	Path string
}

// File takes lines of facts that are appended to a file: it may be renamed
// away and made anew, or cut. What it holds at the start is past and is left.
type File struct {
	*desk
	path string
}

// FollowFile starts nothing. The file need not be there.
func FollowFile(o FileOptions) (*File, error) {
	d, err := newDesk(o.Options)
	if err == nil && o.Path == "" {
		err = errors.New("it has no path")
	}
	if err != nil {
		return nil, fmt.Errorf("making the feed from the file %s: %w", o.Path, err)
	}
	return &File{desk: d, path: o.Path}, nil
}

// Run follows the file until ctx ends.
func (f *File) Run(ctx context.Context) error {
	var s *sender
	o := &follower{path: f.path, clock: f.options.Clock, desk: f.desk, begin: func() { s = f.sender(f.path, true) }}
	o.line = func(text []byte, long bool) error {
		if long {
			s.tooLong(text)
			return nil
		}
		return s.fact(ctx, text)
	}
	return o.run(ctx)
}
