package modes

import "time"

// kind is who speaks under an address. Reports by a ground station are kept
// apart from what the aircraft itself sends.
type kind uint8

const (
	own       kind = iota // DF 17, 11, and DF 18 of equipment with an address of its own
	anonymous             // DF 18 with an address that is not the aircraft's own
	tisb                  // surveillance by ground stations
	tisbOther             // the same, under a number of the station's
	adsr                  // sent again by ground stations
	adsrOther
)

// prefixes tell the kinds apart in reports.
var prefixes = [...]string{own: "", anonymous: "anon-", tisb: "tisb-", tisbOther: "tisb-anon-", adsr: "adsr-", adsrOther: "adsr-anon-"}

// lags bounds how much later than the aircraft's own word a ground station's
// comes: 3.25 s and 2 s are asked of them (DO-260B, from memory).
var lags = [...]float64{tisb: 4, tisbOther: 4, adsr: 3, adsrOther: 3}

type key uint32

func keyOf(k kind, address uint32) key { return key(k)<<24 | key(address) }

// How many positions and places are remembered of one address.
const (
	keptFrames = 16
	keptTracks = 3
)

// sent is one position as it came.
type sent struct {
	at    int64   // Unix nanoseconds
	first int64   // since when it was sent, to the bit
	me    message // 0: none
	cpr   CPR
}

// track is one place where an aircraft of the address was.
type track struct {
	at        int64 // 0: none
	place     place
	near      bool  // the site itself gives the same answer: beyond doubt
	even, odd uint8 // frames that agreed, of each format, since one did not
}

// firmness is how many frames of each format must agree in a row for a place
// that the site does not vouch for: frames of two aircraft can be mixed into a
// third place, but not for long.
const firmness = 3

// stands reports whether the track can be reported.
func (t *track) stands() bool {
	return t.at != 0 && (t.near || t.even >= firmness && t.odd >= firmness)
}

// agree takes in a position that agrees with the track.
func (t *track) agree(now *sent, p place, near bool) {
	if t.near && !near {
		t.even, t.odd = firmness, firmness // it leaves the site's zone in plain view
	}
	t.at, t.place, t.near = now.at, p, near
	if now.cpr.Odd {
		t.odd = min(t.odd+1, firmness)
	} else {
		t.even = min(t.even+1, firmness)
	}
}

// aircraft is what is remembered of one address.
type aircraft struct {
	key      key
	name     string
	newer    int32 // in order of hearing
	older    int32
	frames   uint32
	heard    int64
	located  int64 // of the last report with a position; 0: none
	nameless int64 // of the last report without
	sent     [keptFrames]sent
	next     uint8 // in sent
	tracks   [keptTracks]track
	suspect  int64 // until when two aircraft may be speaking
	velocity Velocity
	moved    int64 // when the velocity came; 0: never
	status   Status
	stated   int64 // when the status came; 0: never
	sign     string
}

func (a *aircraft) newest() *sent { return &a.sent[(a.next+keptFrames-1)%keptFrames] }

// keep remembers a position.
func (a *aircraft) keep(s sent) {
	a.sent[a.next] = s
	a.next = (a.next + 1) % keptFrames
}

// store holds a bounded number of aircraft; the one heard longest ago makes
// room.
type store struct {
	index          map[key]int32
	list           []aircraft
	newest, oldest int32 // -1: none
	most           int
	evicted        uint64
}

func newStore(most int) store {
	return store{index: make(map[key]int32, most), newest: -1, oldest: -1, most: most}
}

// find returns an aircraft that is known.
func (s *store) find(k key) *aircraft {
	if i, ok := s.index[k]; ok {
		return &s.list[i]
	}
	return nil
}

// hear returns an aircraft, new or known, and makes it the one heard last.
func (s *store) hear(k key) *aircraft {
	i, known := s.index[k]
	switch {
	case known:
		if i == s.newest {
			return &s.list[i]
		}
		s.unlink(i)
	case len(s.list) < s.most:
		i = int32(len(s.list))
		s.list = append(s.list, aircraft{})
		s.fill(i, k)
	default:
		i = s.oldest
		s.unlink(i)
		delete(s.index, s.list[i].key)
		s.evicted++
		s.fill(i, k)
	}
	a := &s.list[i]
	a.older, a.newer = s.newest, -1
	if s.newest >= 0 {
		s.list[s.newest].newer = i
	}
	s.newest = i
	if s.oldest < 0 {
		s.oldest = i
	}
	return a
}

func (s *store) fill(i int32, k key) {
	const digits = "0123456789abcdef"
	name := []byte(prefixes[k>>24])
	for shift := 20; shift >= 0; shift -= 4 {
		name = append(name, digits[k>>shift&15])
	}
	s.list[i] = aircraft{key: k, name: string(name), newer: -1, older: -1}
	s.index[k] = i
}

func (s *store) unlink(i int32) {
	a := &s.list[i]
	if a.older >= 0 {
		s.list[a.older].newer = a.newer
	} else {
		s.oldest = a.newer
	}
	if a.newer >= 0 {
		s.list[a.newer].older = a.older
	} else {
		s.newest = a.older
	}
}

func (s *store) forget() {
	clear(s.index)
	s.list = s.list[:0]
	s.newest, s.oldest = -1, -1
}

const second = int64(time.Second)
