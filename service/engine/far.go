package engine

import (
	"cmp"
	"slices"
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
	"beamward/geometry"
)

// farEvery is how often a track beyond watch_range is admitted. Its reach is
// no smaller for that: it grows with the report's age.
const farEvery = time.Second

// farForget is after how long a far track that is silent is forgotten here.
const farForget = 30 * time.Second

// far holds back the reports of aircraft beyond watch_range, the newest of
// each, until a second has passed since the last that was admitted.
type far struct {
	site   r3.Vector // Earth-fixed, metres
	beyond float64   // metres; 0: nothing is held back
	tracks map[subject]*farTrack
	looked time.Duration
}

type farTrack struct {
	admitted time.Duration
	waits    bool
	newest   pending
}

func (f *far) setRules(r *closures.Rules) {
	f.site, f.beyond = r.Site.Position.ECEF(), 0
	if r.Aircraft.Configured {
		f.beyond = float64(r.Aircraft.WatchRange)
	}
	if f.tracks == nil {
		f.tracks = map[subject]*farTrack{}
	}
}

// keep holds a far report back; kept is false where it goes on its way.
func (f *far) keep(p *pending) (done Intake, kept bool) {
	if f.beyond <= 0 || p.kind != kindAircraft {
		return Accepted, false
	}
	a := p.body.(closures.AircraftSeen)
	t := f.tracks[p.key]
	if !f.isFar(&a) {
		if t != nil {
			delete(f.tracks, p.key)
		}
		return Accepted, false
	}
	if t == nil {
		if len(f.tracks) < MaxLatest {
			f.tracks[p.key] = &farTrack{admitted: p.boot}
		}
		return Accepted, false
	}
	if p.boot-t.admitted >= farEvery {
		t.admitted, t.waits, t.newest = p.boot, false, pending{}
		return Accepted, false
	}
	done = Accepted
	if t.waits {
		done = Superseded
	}
	if t.waits && a.Said.Before(saidBy(t.newest.body)) {
		return done, true
	}
	t.waits, t.newest = true, *p
	return done, true
}

// isFar is false for what cannot be placed.
func (f *far) isFar(a *closures.AircraftSeen) bool {
	if !a.Located || !geometry.Finite(float64(a.Position.Height)) || !a.Position.Valid() {
		return false
	}
	return a.Position.ECEF().Sub(f.site).Norm() > f.beyond
}

// due lets go what waited its second, in order of arrival, and forgets who is
// silent.
func (f *far) due(boot time.Duration, put func(pending)) {
	if len(f.tracks) == 0 || boot-f.looked < 100*time.Millisecond {
		return
	}
	f.looked = boot
	var ripe []*farTrack
	for k, t := range f.tracks {
		switch {
		case t.waits && boot-t.admitted >= farEvery:
			ripe = append(ripe, t)
		case !t.waits && boot-t.admitted >= farForget:
			delete(f.tracks, k)
		}
	}
	slices.SortFunc(ripe, func(a, b *farTrack) int {
		x, y := &a.newest, &b.newest
		return cmp.Or(cmp.Compare(x.boot, y.boot), cmp.Compare(x.key.name, y.key.name), cmp.Compare(x.key.by, y.key.by), cmp.Compare(x.key.from, y.key.from), cmp.Compare(x.key.variant, y.key.variant))
	})
	for _, t := range ripe {
		put(t.newest)
		t.admitted, t.waits, t.newest = boot, false, pending{}
	}
}
