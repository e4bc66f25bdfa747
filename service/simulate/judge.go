package simulate

import (
	"time"

	"github.com/golang/geo/r3"

	"beamward/closures"
)

// world is what truly happens, as the judge asks for it. Directions are unit
// vectors; east, north, up of the site.
type world interface {
	// trueAim is where the light goes among the stars.
	trueAim(beam closures.BeamID, at time.Time) r3.Vector
	// moves reports whether the telescope is on its way elsewhere.
	moves(beam closures.BeamID, at time.Time) bool
	// overhead is where a place among the stars stands.
	overhead(icrs r3.Vector, at time.Time) r3.Vector
	// neighbour is the other telescope's true axis, which of its pointings that
	// is, and whether it looks.
	neighbour(at time.Time) (axis r3.Vector, pointing int, looks bool)
	// airborne are the aircraft, in metres.
	airborne(at time.Time) []r3.Vector
	// unsafe reports since when people on site are in danger; zero: they are not.
	unsafe(at time.Time) time.Time
}

// The site's bounds as the judge has them, in its own numbers.
const (
	lease       = 2 * time.Second
	clockWrong  = 200 * time.Millisecond
	listTail    = 5 * time.Second
	surveyLead  = 2 * time.Second
	surveyTail  = time.Second
	keepRadiusM = 300.0
	keepHalfDeg = 2.0
	keepTopM    = 20000.0
	aircraftM   = 50.0
	sunBelowDeg = -12.0
	fieldDeg    = 0.3
	mirrorM     = 8.0
	siteHeightM = 2450.0
	earthM      = 6371000.0
)

// beamPaper is one beam as the judge has it.
type beamPaper struct {
	shutter     time.Duration
	lowest      float64 // degrees
	highest     float64
	asterism    float64 // radians
	aperture    float64 // metres
	launches    []r3.Vector
	star        [2]float64 // heights over the ellipsoid, metres
	telescopeAt r3.Vector  // the neighbour's
}

const arcsec = 4.84813681109536e-6

var ridge = r3.Vector{X: 140, Y: -60, Z: 3}

// papers are the beams. They are written here again rather than read from the
// daemon's rules, so that a wrong reading there shows.
func papers() map[closures.BeamID]beamPaper {
	return map[closures.BeamID]beamPaper{
		"north": {500 * time.Millisecond, 30, 89, 20 * arcsec, 0.30, []r3.Vector{{Z: 12}}, [2]float64{80e3, 110e3}, ridge},
		"south": {300 * time.Millisecond, 40, 90, 120 * arcsec, 0.25, []r3.Vector{{X: -4.2, Y: -80, Z: 9}, {X: 4.2, Y: -80, Z: 9}}, [2]float64{12e3, 22e3}, ridge},
	}
}

func (p *beamPaper) margin() time.Duration { return p.shutter + clockWrong }

// guard is how long light may last after the daemon came to know: a permit
// given just before runs for the lease, its reader's clock may be behind, and
// the shutter takes its time.
func (p *beamPaper) guard() time.Duration { return lease + p.margin() }

// cause is one thing for which the beam must be dark. known is when the daemon
// was told, from which on no permit may be open; due is when the light must be
// off, where that is not the same.
type cause struct {
	what       string
	known, due time.Time
}

// Unsafe is something the judge found.
type Unsafe struct {
	At   time.Time
	Beam closures.BeamID
	What string // "permit: cause" or "light: cause"
	For  time.Duration
}

// judge knows the truth and what was told, and looks at permits and light.
type judge struct {
	world  world
	papers map[closures.BeamID]beamPaper
	told   told
	looked map[closures.BeamID]time.Time
	found  []Unsafe
}

func newJudge(w world) *judge {
	return &judge{world: w, papers: papers(), looked: map[closures.BeamID]time.Time{}, told: newTold()}
}

// permit looks at a permit that was just read.
func (j *judge) permit(beam closures.BeamID, at time.Time, open bool) {
	if !open {
		return
	}
	for _, c := range j.causes(beam, at) {
		if !at.Before(c.known) {
			j.finds(beam, at, "permit: "+c.what)
		}
	}
}

// light looks at an instant at which light is on, by the permit that was valid
// until then.
func (j *judge) light(beam closures.BeamID, at, validUntil time.Time) {
	p := j.papers[beam]
	if at.After(validUntil.Add(p.margin())) {
		j.finds(beam, at, "light: the permit ran out")
	}
	if j.world.moves(beam, at) {
		j.finds(beam, at, "light: the telescope moves")
	}
	for _, c := range j.causes(beam, at) {
		if !at.Before(c.due) {
			j.finds(beam, at, "light: "+c.what)
		}
	}
	j.looked[beam] = at
}

// dark says that there was no light at an instant.
func (j *judge) dark(beam closures.BeamID, at time.Time) { j.looked[beam] = at }

// finds counts the time since the last look, and at least a millisecond.
func (j *judge) finds(beam closures.BeamID, at time.Time, what string) {
	j.found = append(j.found, Unsafe{at, beam, what, max(at.Sub(j.looked[beam]), time.Millisecond)})
}

// causes are all for which a beam must be dark at an instant.
func (j *judge) causes(beam closures.BeamID, at time.Time) []cause {
	p := j.papers[beam]
	var out []cause
	add := func(what string, known, due time.Time) { out = append(out, cause{what, known, due}) }
	live := func(what string, known time.Time) { add(what, known, known.Add(p.guard())) }
	foreseen := func(what string, known, from time.Time) { add(what, known, later(from, known.Add(p.guard()))) }

	aim := j.world.trueAim(beam, at)
	up := j.world.overhead(aim, at)
	j.told.people(beam, at, up, &p, live, foreseen)
	j.told.sources(beam, at, live)
	j.told.listed(beam, at, aim, up, &p, live, foreseen)
	if el := seenElevation(up); !(el-p.asterism/degree >= p.lowest && el+p.asterism/degree <= p.highest) {
		add("elevation", time.Time{}, time.Time{})
	}
	if !(sunElevation(at) < sunBelowDeg) {
		add("daylight", time.Time{}, time.Time{})
	}
	for _, a := range j.world.airborne(at) {
		if inKeepOut(a, up, &p) {
			add("aircraft in the keep-out", time.Time{}, time.Time{})
		}
	}
	if axis, pointing, looks := j.world.neighbour(at); looks && crosses(up, axis, &p) {
		live("neighbour's field", j.told.neighbourKnown(pointing))
	}
	if since := j.world.unsafe(at); !since.IsZero() {
		live("people in danger", since.Add(interlockStale)) // by then the word or the silence tells
	}
	return out
}

func later(a, b time.Time) time.Time {
	if a.After(b) {
		return a
	}
	return b
}
