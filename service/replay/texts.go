package replay

import (
	"errors"
	"fmt"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
)

// Texts finds what the record names by its digest. Both are needed; what they
// return must have the digest that was asked for.
type Texts struct {
	Rules func(closures.Digest) (*closures.Rules, error)
	List  func(closures.Digest) (*closures.List, error)
}

// The most of each that is kept at hand besides what is in force.
const (
	mostRules  = 8
	mostNights = 16
)

// shelf keeps at hand what was found. It has one owner.
type shelf struct {
	from   Texts
	force  *closures.Rules // whose nights are meant
	rules  map[closures.Digest]*closures.Rules
	lists  map[closures.Digest]*closures.List
	nights map[nightKey]*sky.Night
}

// nightKey is all that a night depends on.
type nightKey struct {
	site earth.Position
	ut1  sky.UT1
	bin  int64 // start, Unix seconds
}

func newShelf(from Texts) (*shelf, error) {
	if from.Rules == nil || from.List == nil {
		return nil, errors.New("replaying: no way was given to find the rules and lists that the record names")
	}
	return &shelf{
		from: from, rules: map[closures.Digest]*closures.Rules{}, lists: map[closures.Digest]*closures.List{}, nights: map[nightKey]*sky.Night{},
	}, nil
}

// resolver is the shelf as the record's reader asks it.
func (s *shelf) resolver() wire.Resolver {
	return wire.Resolver{Rules: s.theRules, List: s.list, Night: s.night}
}

func (s *shelf) theRules(d closures.Digest) (*closures.Rules, error) {
	if r := s.rules[d]; r != nil {
		return r, nil
	}
	r, err := s.from.Rules(d)
	if err != nil {
		return nil, err
	}
	if r == nil || r.Digest != d {
		return nil, fmt.Errorf("the rules %s: others were found under this name", d)
	}
	if len(s.rules) >= mostRules {
		clear(s.rules)
	}
	s.rules[d] = r
	return r, nil
}

func (s *shelf) list(d closures.Digest) (*closures.List, error) {
	if l := s.lists[d]; l != nil {
		return l, nil
	}
	l, err := s.from.List(d)
	if err == nil {
		s.lists[d] = l
	}
	return l, err
}

// keep lets go of the lists that are not in the book.
func (s *shelf) keep(book closures.Book) {
	if len(s.lists) <= len(book) {
		return
	}
	kept := make(map[closures.Digest]*closures.List, len(book))
	for i := range book {
		d := book[i].List.Digest()
		kept[d] = book[i].List
	}
	s.lists = kept
}

// night prepares the sky of a bin under the rules in force, as the engine did.
func (s *shelf) night(bin time.Time) (*sky.Night, error) {
	if s.force == nil {
		return nil, errors.New("no rules are in force")
	}
	key := nightKey{s.force.Site.Position, s.force.Site.UT1, bin.Unix()}
	if n := s.nights[key]; n != nil {
		return n, nil
	}
	n, err := sky.Prepare(key.site, bin, key.ut1)
	if err != nil {
		return nil, err
	}
	if len(s.nights) >= mostNights {
		clear(s.nights)
	}
	s.nights[key] = n
	return n, nil
}
