package closures

import (
	"math"
	"time"

	"beamward/geometry"
	"beamward/geometry/crossing"
	"beamward/geometry/earth"
	"beamward/geometry/sky"

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
	for i := range f.Rules.Neighbours {
		n := &f.Rules.Neighbours[i]
		if !n.minds(q.Beam.Wavelength) {
			continue
		}
		f.cross(q, n, f.pointing(n.ID), sh, &least)
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

func (f *Foreseen) pointing(id TelescopeID) *Pointing {
	for i := range f.Pointings {
		if f.Pointings[i].Telescope == id {
			return &f.Pointings[i]
		}
	}
	return nil
}

// cross finds when the beam may be in one neighbour's field. Who is silent
// matters to a decision; a plan takes the last aim that it knows, and says so
// where there is none.
func (f *Foreseen) cross(q *Question, n *NeighbourRules, p *Pointing, sh *Sheet, least *Margin) {
	unknown := func(detail string) {
		sh.add(Finding{Code: CodeFieldCrossing, Source: Source(n.ID), Verdict: Unknown, Over: q.Over, Margin: UnknownMargin(), Detail: detail})
		least.Value = math.NaN()
	}
	caution := func(detail string) {
		sh.Cautions = append(sh.Cautions, Caution{Code: CodeFieldCrossing, Source: Source(n.ID), Detail: detail})
	}
	if n.Yields == YieldsTheirs {
		return
	}
	known := p != nil && p.Aim != nil
	if !q.Now.IsZero() {
		old := time.Duration(math.MaxInt64)
		if p != nil {
			old = age(q.Now, p.Seen.Said, p.Heard)
		}
		switch silent := !(old <= n.StaleAfter) || !known; {
		case silent && !n.IgnoreSilent:
			unknown("the neighbour's pointing is not known")
			return
		case silent && (!known || !(old <= n.ForgetAfter)):
			caution("the neighbour is silent and its last pointing is forgotten")
			return
		case silent:
			caution("the neighbour is silent; its last pointing counts")
		}
	} else if !known {
		caution("the neighbour's pointing is not known, so the plan leaves it out")
		return
	}
	if n.OnlyExposing && p.Seen.Exposing == No {
		return
	}
	if n.Yields == YieldsLater && !q.AimBegan.IsZero() && q.AimBegan.Before(p.AimBegan) {
		return // theirs began later
	}
	for i := range q.Beam.Launches {
		pair, err := f.pair(q, n, p, &q.Beam.Launches[i])
		if err != nil {
			unknown("the geometry of the neighbour and the beam cannot be told")
			return
		}
		f.crossPair(q, n, p, &pair, sh, least)
	}
}

// pair makes one launch and one telescope ready.
func (f *Foreseen) pair(q *Question, n *NeighbourRules, p *Pointing, l *Launch) (crossing.Pair, error) {
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
	return crossing.Prepare(beam, telescope, crossing.Column(n.Halo), star)
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

func (f *Foreseen) crossPair(q *Question, n *NeighbourRules, p *Pointing, pair *crossing.Pair, sh *Sheet, least *Margin) {
	beam, _ := q.overhead()
	theirs := Question{Beam: q.Beam, Aim: p.Aim}
	axis, axisRate := theirs.overhead()
	margin := func(night *sky.Night, at time.Time) (float64, float64) {
		a := axis(night, at)
		r := pair.Margin(beam(night, at), a)
		lift, slope := liftNear(a)
		return r.Margin - lift, r.Rate + slope*axisRate
	}
	found := Finding{Code: CodeFieldCrossing, Source: Source(n.ID), Verdict: Violated, Margin: Margin{Unit: Radian}, Detail: "the beam crosses the field of a neighbour telescope"}
	sh.scratch[0] = q.searchRated(sh.scratch[0], q.Over, margin)
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
func (s *State) fromTheirs(n *NeighbourRules, a *Aim) *Aim {
	if a == nil || a.Frame != Horizon || n.Offset == (r3.Vector{}) {
		return a
	}
	ours := earth.FrameAt(s.rules.Site.Position)
	there := earth.FromECEF(ours.ECEF(n.Offset))
	turned := *a
	turned.Direction = crossing.Turn(a.Direction, earth.FrameAt(there), ours)
	return &turned
}
