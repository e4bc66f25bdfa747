package closures

import (
	"math"
	"slices"
	"time"

	"beamward/geometry"
	"beamward/geometry/crossing"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// fieldCrossing is the check that the beam keeps out of the neighbour
// telescopes' fields: its scattering column and its star, from every launch.
type fieldCrossing struct{}

func (fieldCrossing) Code() Code { return CodeFieldCrossing }

func (fieldCrossing) Look(f *Foreseen, q *Question, sh *Sheet) {
	first := sh.begin()
	least := Margin{Value: math.Inf(1), Unit: Radian}
	planned := q.Now.IsZero()
	var up span.Set
	if planned && len(f.Rules.Neighbours) > 0 {
		up = q.risen(f, sh)
	}
	for i := range f.Rules.Neighbours {
		n := &f.Rules.Neighbours[i]
		switch {
		case !n.minds(q.Beam.Wavelength) || n.Yields == YieldsTheirs:
		case planned:
			f.crossPlanned(q, up, n, sh, &least)
		default:
			f.cross(q, n, sh, &least)
		}
	}
	sh.sortFrom(first)
	sh.finish(CodeFieldCrossing, first, least)
}

// minds reports whether the beam's light lies in one of the telescope's
// passbands; with none stated it does.
func (n *NeighbourRules) minds(wavelength geometry.Length) bool {
	for _, b := range n.Passbands {
		if b.From <= wavelength && wavelength <= b.Until {
			return true
		}
	}
	return len(n.Passbands) == 0
}

// pointing returns a telescope's present pointing, or nil.
func (f *Foreseen) pointing(id TelescopeID) *Pointing {
	for i := range f.Pointings {
		if f.Pointings[i].Telescope == id && !f.Pointings[i].Scheduled {
			return &f.Pointings[i]
		}
	}
	return nil
}

// cross finds when the beam may be in one neighbour's field, for a decision.
func (f *Foreseen) cross(q *Question, n *NeighbourRules, sh *Sheet, least *Margin) {
	p := f.pointing(n.ID)
	known := p != nil && p.Aim != nil
	old := time.Duration(math.MaxInt64)
	if p != nil {
		old = age(q.Now, p.Seen.Said, p.Heard)
	}
	switch silent := !(old <= n.StaleAfter) || !known; {
	case silent && !n.IgnoreSilent:
		sh.unknownCrossing(q, n, least, "the neighbour's pointing is not known")
		return
	case silent && (!known || !(old <= n.ForgetAfter)):
		sh.caution(n, "the neighbour is silent and its last pointing is forgotten")
		return
	case silent:
		sh.caution(n, "the neighbour is silent; its last pointing counts")
	}
	f.crossPointing(q, n, p, nil, sh, least)
}

// crossPlanned is cross for a plan. Who is silent matters to a decision; a plan
// takes the pointings of a timetable, for the rest the last one that it knows,
// and says so where there is none. up is when the beam is above the horizon.
func (f *Foreseen) crossPlanned(q *Question, up span.Set, n *NeighbourRules, sh *Sheet, least *Margin) {
	known := sh.scratch[2][:0]
	for i := range f.Pointings {
		p := &f.Pointings[i]
		if p.Telescope != n.ID || p.Aim == nil {
			continue
		}
		over := p.over(q.Over)
		if over.Empty() {
			continue
		}
		known = append(known, over)
		switch {
		case n.OnlyExposing && p.Seen.Exposing == No && !p.Scheduled:
			sh.caution(n, "the neighbour is not exposing now, so the plan leaves it out")
		case !p.Scheduled:
			sh.caution(n, "the plan takes the neighbour's present aim for the time to come")
		}
		part := *q
		for _, s := range up {
			if part.Over = s.Intersect(over); !part.Over.Empty() {
				f.crossPointing(&part, n, p, q.Shared.passages(q, i), sh, least)
			}
		}
	}
	sh.scratch[2] = known
	if !span.Tidy(known).Covers(q.Over) {
		sh.caution(n, "the neighbour's pointing is not known, so the plan leaves it out")
	}
}

// risen returns when the beam may be above the horizon, or all of the question's
// span for a beam that may point lower: a beam below the horizon is in nobody's
// field, and its elevation closes it whatever else does.
func (q *Question) risen(f *Foreseen, sh *Sheet) span.Set {
	if !(q.Beam.Limits.ElevationMin >= 0) {
		return append(sh.scratch[1][:0], q.Over)
	}
	direction, rate := q.overhead()
	spare := q.extent().Radians() + setting
	coarse := *q
	coarse.Edge = time.Minute
	turn := q.turning(f)
	sh.scratch[1] = coarse.searchRated(sh.scratch[1], q.Over, q.Aim.reach(q.Over), func(n *sky.Night, at time.Time) (float64, float64) {
		d := direction(n, at)
		down := -spare - n.Error().Radians()
		m := down - math.Atan2(d.Z, math.Hypot(d.X, d.Y))
		return m, turn.rate(m, rate, d, down)
	})
	return sh.scratch[1]
}

// setting is how far below the horizon, airless, a beam is surely below its
// lowest elevation: what the air lifts there at most, and its error.
const setting = 2 * math.Pi / 180

// over returns when, within a span, the pointing counts.
func (p *Pointing) over(whole span.Span) span.Span {
	if p.During == (span.Span{}) {
		return whole
	}
	return whole.Intersect(p.During)
}

func (s *Sheet) unknownCrossing(q *Question, n *NeighbourRules, least *Margin, detail string) {
	s.add(Finding{Code: CodeFieldCrossing, Source: Source(n.ID), Verdict: Unknown, Over: q.Over, Margin: UnknownMargin(), Detail: detail})
	least.Value = math.NaN()
}

// caution says something of a neighbour, once.
func (s *Sheet) caution(n *NeighbourRules, detail string) {
	c := Caution{Code: CodeFieldCrossing, Source: Source(n.ID), Detail: detail}
	if !slices.Contains(s.Cautions, c) {
		s.Cautions = append(s.Cautions, c)
	}
}

// crossPointing finds when the beam may be in the field at one pointing. ready
// are its passages where they are at hand.
func (f *Foreseen) crossPointing(q *Question, n *NeighbourRules, p *Pointing, ready []passage, sh *Sheet, least *Margin) {
	if n.OnlyExposing && p.Seen.Exposing == No {
		return
	}
	if n.Yields == YieldsLater && !q.AimBegan.IsZero() && q.AimBegan.Before(p.AimBegan) {
		return // theirs began later
	}
	if ready == nil {
		var err error
		if ready, err = f.passages(sh.passages[:0], q, n, p); err != nil {
			sh.unknownCrossing(q, n, least, "the geometry of the neighbour and the beam cannot be told")
			return
		}
		sh.passages = ready
	}
	for i := range ready {
		f.crossPassage(q, n, p, &ready[i], sh, least)
	}
}

// pairing states one launch and one pointing for package crossing.
func (f *Foreseen) pairing(q *Question, n *NeighbourRules, p *Pointing, l *Launch) (crossing.Beam, crossing.Telescope, [2]crossing.Part) {
	_, ours := q.overhead()
	theirs := Question{Beam: q.Beam, Aim: p.Aim}
	_, rate := theirs.overhead()
	night := s1.Angle(0)
	for _, o := range q.Nights {
		night = max(night, o.Error())
	}
	b := q.Beam
	profile := geometry.Profile{Aperture: b.Aperture, Focus: b.FocusHeight, Wavelength: b.Wavelength, Quality: 1}
	field := n.Field
	if p.Seen.Field > 0 {
		field = p.Seen.Field
	}
	beam := crossing.Beam{
		Site: f.Rules.Site.Position, Launch: l.Offset, Radius: b.Aperture / 2, Spread: max(profile.Divergence()/2, s1.Angle(seeing)),
		AimError: q.extent() + night + bending + f.converging(b, l), Rate: ours,
	}
	telescope := crossing.Telescope{Position: n.Offset, Field: field, Aperture: n.Aperture, AimError: p.Aim.Error + n.AimError + night + bending, Rate: rate}
	star := crossing.Sodium(n.Halo)
	if b.GuideStar.Rayleigh {
		star = crossing.Part{From: b.GuideStar.From, Until: b.GuideStar.Until, Halo: n.Halo}
	}
	return beam, telescope, [...]crossing.Part{crossing.Column(n.Halo), star}
}

// converging bounds the angle between the aim and the direction from a launch
// beside the site's origin to the lowest light of the star.
func (f *Foreseen) converging(b *BeamRules, l *Launch) s1.Angle {
	lowest := crossing.SodiumFrom
	if b.GuideStar.Rayleigh {
		lowest = b.GuideStar.From
	}
	lowest -= f.Rules.Site.Position.Height
	if !(lowest > 0) {
		return math.Pi
	}
	return s1.Angle(math.Atan2(l.Offset.Norm(), float64(lowest)))
}

// seeing is the least half angle to which the air widens a beam: 1 arcsec.
const seeing = float64(geometry.Arcsecond)

// Near the horizon the air bends what a telescope sees by up to 35 arcmin, 25
// more than bending. The whole is allowed for up to an elevation of 5°, and it
// fades to nothing at 10° so that the margin has no step.
const (
	lowLift  = 25.0 / 60 * math.Pi / 180
	lowFull  = 5 * math.Pi / 180
	lowFades = 5 * math.Pi / 180 // above lowFull
)

// liftNear returns what is allowed for an axis near the horizon, and its slope
// bound against the elevation.
func liftNear(axis r3.Vector) (lift, slope float64) {
	el := math.Atan2(axis.Z, math.Hypot(axis.X, axis.Y))
	return lowLift * min(1, max(0, 1-(el-lowFull)/lowFades)), lowLift / lowFades
}

func (f *Foreseen) crossPassage(q *Question, n *NeighbourRules, p *Pointing, o *passage, sh *Sheet, least *Margin) {
	beam, _ := q.overhead()
	theirs := Question{Beam: q.Beam, Aim: p.Aim}
	axis, axisRate := theirs.overhead()
	slack := q.Slack.Seconds()
	margin := func(night *sky.Night, at time.Time) (float64, float64) {
		b, a := beam(night, at), axis(night, at)
		r := o.pair.Margin(b, a)
		lift, slope := liftNear(a)
		rate := r.Rate + slope*axisRate
		m := r.Margin - lift - rate*slack
		if !q.Now.IsZero() {
			return m, rate
		}
		sure := 0.0
		if m > 0 {
			sure = o.clear(b, a, &r, rate*slack, lift, m/rate)
		} else {
			sure = o.shut(b, a, &r, rate*slack, lift)
		}
		if sure*rate > math.Abs(m) {
			rate = math.Abs(m) / sure
		}
		return m, rate
	}
	found := Finding{Code: CodeFieldCrossing, Source: Source(n.ID), Verdict: Violated, Margin: Margin{Unit: Radian}, Detail: "the beam crosses the field of a neighbour telescope"}
	sh.scratch[0] = q.searchRated(sh.scratch[0], q.Over, p.Aim.reach(q.Aim.reach(q.Over)), margin)
	for _, s := range sh.scratch[0] {
		found.Over = s
		sh.add(found)
	}
	now := math.NaN()
	if night := nightAt(q.Nights, q.Over.From); night != nil {
		now, _ = margin(night, q.Over.From)
	}
	if !(now >= least.Value) {
		least.Value = now
	}
}

// fromTheirs turns an aim stated by azimuth and elevation at a neighbour into
// our frame.
func (s *State) fromTheirs(n *NeighbourRules, a *Aim) *Aim { return s.rules.fromTheirs(n, a) }

func (r *Rules) fromTheirs(n *NeighbourRules, a *Aim) *Aim {
	if a == nil || a.Frame != Horizon || n.Offset == (r3.Vector{}) {
		return a
	}
	ours := earth.FrameAt(r.Site.Position)
	there := earth.FromECEF(ours.ECEF(n.Offset))
	turned := *a
	turned.Direction = crossing.Turn(a.Direction, earth.FrameAt(there), ours)
	return &turned
}
