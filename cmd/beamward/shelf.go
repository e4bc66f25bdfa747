package main

import (
	"cmp"
	"errors"
	"fmt"
	"io/fs"
	"slices"
	"time"

	"beamward/closures"
	"beamward/service/config"
)

// shelf is the book that lists make which are taken one after the other, each
// as if it had been confirmed.
type shelf struct {
	rules *closures.Rules
	book  closures.Book
}

// offer puts a list on the shelf as the service would take it. The error says
// why it could not be taken.
func (s *shelf) offer(l *closures.List, by string) (same, tightens bool, err error) {
	same, tightens, err = s.book.Offer(s.rules, l)
	if err != nil || same {
		return same, tightens, err
	}
	for _, id := range l.Text().Replaces {
		if old := s.book.Find(l.Authority(), id); old != nil {
			old.Status = closures.ListReplaced
		}
	}
	s.book = append(s.book, closures.Entry{List: l, By: by, Status: closures.ListInForce})
	slices.SortFunc(s.book, func(x, y closures.Entry) int {
		return cmp.Or(cmp.Compare(x.List.Authority(), y.List.Authority()), cmp.Compare(x.List.ID(), y.List.ID()))
	})
	return false, tightens, nil
}

// stock reads every list of the configured folders and of dir (empty: none) in
// order of issue, so that each finds what it replaces. One that cannot be taken
// spoils the whole: what it would have closed must not be left out in silence.
func stock(c *config.Config, dir string) (*shelf, error) {
	r, err := newListReader(c, "")
	if err != nil {
		return nil, err
	}
	var files []string
	for _, f := range c.Folders {
		some, err := filesOf(f.Path)
		if err != nil && !errors.Is(err, fs.ErrNotExist) {
			return nil, fmt.Errorf("reading the folder of %s: %w", f.Authority, err)
		}
		files = append(files, some...)
	}
	if dir != "" {
		some, err := filesOf(dir)
		if err != nil {
			return nil, fmt.Errorf("reading the folder of lists: %w", err)
		}
		files = append(files, some...)
	}
	var bad []error
	var lists []readList
	for _, path := range files {
		l := r.read(path, false)
		if err := l.told(); err != nil {
			bad = append(bad, err)
			continue
		}
		lists = append(lists, l)
	}
	sortByIssue(lists)
	s := &shelf{rules: c.Rules}
	for i := range lists {
		if _, _, err := s.offer(lists[i].list, lists[i].path); err != nil {
			bad = append(bad, fmt.Errorf("%s: %w", lists[i].path, err))
		}
	}
	if len(bad) > 0 {
		return nil, errors.Join(append(bad, errors.New("a list that cannot be taken may close time: mend it, or take it out"))...)
	}
	return s, nil
}

// sortByIssue puts the lists that could be read in order of issue, and those
// that could not before them.
func sortByIssue(lists []readList) {
	issued := func(l *readList) time.Time {
		if l.list == nil {
			return time.Time{}
		}
		return l.list.Text().Issued
	}
	slices.SortStableFunc(lists, func(x, y readList) int { return issued(&x).Compare(issued(&y)) })
}

// foreseen is what a decision and a plan see of the shelf.
func (s *shelf) foreseen(at time.Time) (*closures.Foreseen, error) {
	state, err := closures.New(s.rules, closures.Boot{ID: "offline", At: at}, closures.Durable{Lists: s.book})
	if err != nil {
		return nil, err
	}
	return state.Foreseen(), nil
}
