package closures

import (
	"cmp"
	"math"
	"slices"
	"time"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/encounter"

	"github.com/golang/geo/s1"
)

// tracks holds what is known of aircraft: for each address and source the
// reports that still count, ready to be asked whether they could touch a beam.
// Sources are never fused: an aircraft heard by two counts twice, which is the
// union.
type tracks struct {
	index  map[trackKey]int
	list   []track
	quiet  []int64 // for each track, Unix nanoseconds up to which it cannot touch any beam
	frame  earth.Frame
	site   earth.Position
	motion encounter.Motion
	domes  []encounter.Dome // one a launch of a beam
	guard  time.Duration    // the longest of any beam
	popups uint64
}

type trackKey struct {
	aircraft string
	source   Source
	drill    bool // apart from a true aircraft of the same address
}

// mostReports bounds the reports of one track that contradict each other. With
// more, where the aircraft is cannot be told: it could be anywhere.
const mostReports = 4

type track struct {
	key     trackKey
	seen    AircraftSeen // the newest
	heard   time.Time
	reaches [mostReports]encounter.Reach
	reports [mostReports]AircraftSeen // that the reaches were made of
	n       int                       // of reaches; 0: not located
	lost    bool                      // more than mostReports contradict: anywhere
	inside  bool                      // last seen within the detection range
	popup   bool                      // first reported where it could already touch
	ground  bool                      // says that it is on the ground
}

// aircraftExtent is how far an aircraft reaches from its reported point:
// half the span or length of the largest (80 m; common practice, no source).
const aircraftExtent geometry.Length = 50

// Errors of a pressure altitude as a height, where the geometric difference is
// not heard: 100 m and 8 % of the height. Between isobars and heights lie up to
// 8 % in the coldest and hottest air (ISA against -50 and +35 °C at the
// ground), and some 100 m for each 12 hPa of pressure at sea level.
const (
	pressureBase  = 100
	pressureShare = 0.08
)

// groundKeeps is within what distance of the site a reported ground state does
// not end the last airborne reach.
const groundKeeps = 5000

// stampAhead bounds how far ahead of its true instant a report may be stamped.
const stampAhead = MaxClockError

func (t *tracks) setRules(r *Rules) {
	t.site, t.frame = r.Site.Position, earth.FrameAt(r.Site.Position)
	a := &r.Aircraft
	t.motion = encounter.Motion{HorizontalAcceleration: a.HorizontalAccel, VerticalAcceleration: a.VerticalAccel, Speed: a.SpeedMax, Climb: a.ClimbMax}
	t.domes, t.guard = nil, 0
	for i := range r.Beams {
		b := &r.Beams[i]
		guard := r.Guard(b)
		t.guard = max(t.guard, guard)
		for _, l := range b.Launches {
			k := keepOut(r, b, l)
			t.domes = append(t.domes, k.Dome(b.Limits.ElevationMin-b.Aim.Error-b.Asterism, guard))
		}
	}
	if t.index == nil {
		t.index = map[trackKey]int{}
	}
	for i := range t.list { // the bounds may have changed: ask them all again
		t.quiet[i] = math.MinInt64
	}
}

// keepOut returns the keep-out of one launch, without its axis.
func keepOut(r *Rules, b *BeamRules, l Launch) encounter.KeepOut {
	return encounter.KeepOut{
		Launch: l.Offset, HalfAngle: r.Aircraft.KeepOutHalfAngle, Radius: r.Aircraft.KeepOutRadius,
		Ceiling: r.Aircraft.KeepOutCeiling - r.Site.Position.Height, Extent: aircraftExtent,
		AxisError: b.Aim.Error + b.Asterism + b.Aim.UnannouncedMove + bending, AxisRate: s1.Angle(turned(time.Second)),
	}
}

// bending bounds how far the air bends the light, and the aim that is compared
// with it, for elevations over 5° (10 arcmin; Bennett's formula gives 9.9).
const bending = s1.Angle(10.0 / 60 * math.Pi / 180)

func (s *State) applyAircraft(f AircraftSeen, at time.Time) *Error {
	src := s.scene.source(f.Source)
	if src == nil || src.rules.Kind != AircraftSource {
		return noSource(f.Source, "aircraft")
	}
	if f.Aircraft == "" || len(f.Aircraft) > 64 {
		return Errorf(Invalid, "give the aircraft's address", "aircraft: it has no address")
	}
	// A drill closes as a true aircraft would. It proves nothing: neither that
	// the source lives nor that it receives.
	if !f.Drill {
		src.hear(f.Said, at)
		src.count(at)
		if src.rules.ReferenceAddress != "" && f.Aircraft == src.rules.ReferenceAddress {
			src.reference = at
		}
	}
	s.scene.tracks.take(&f, src.rules, s.rules, at)
	return nil
}

// report brings a report to what the geometry asks, with hard errors.
func (t *tracks) report(f *AircraftSeen, src *SourceRules, r *Rules) encounter.Report {
	out := encounter.Report{At: f.Said, Early: src.Latency, Late: stampAhead}
	p := f.Position
	vertical := orElse(float64(f.VerticalError), float64(src.VerticalError))
	switch f.AltitudeFrom {
	case AboveEllipsoid:
		out.AltitudeKnown = true
	case AboveMeanSeaLevel:
		out.AltitudeKnown = true
		p.Height += r.Site.Geoid
	case PressureAltitude:
		out.AltitudeKnown = true
		vertical = pressureBase + pressureShare*math.Abs(float64(p.Height))
		p.Height += r.Site.Geoid
		if v := float64(f.VerticalError); v > vertical {
			vertical = v
		}
	}
	if !out.AltitudeKnown || !geometry.Finite(float64(p.Height)) {
		out.AltitudeKnown, p.Height, vertical = false, t.site.Height, 0
	}
	out.PositionError = encounter.Error{Horizontal: geometry.Length(orElse(float64(f.Error), float64(src.PositionError))), Vertical: geometry.Length(vertical)}
	out.CourseKnown = geometry.Finite(float64(f.Speed), f.Track.Radians())
	out.ClimbKnown = geometry.Finite(float64(f.Climb)) && out.AltitudeKnown
	var east, north, up geometry.Speed
	if out.CourseKnown {
		sin, cos := math.Sincos(f.Track.Radians())
		east, north = f.Speed*geometry.Speed(sin), f.Speed*geometry.Speed(cos)
		out.VelocityError.Horizontal = geometry.Speed(orElse(float64(f.VelocityError), float64(src.VelocityError)))
	}
	if out.ClimbKnown {
		up = f.Climb
		out.VelocityError.Vertical = geometry.Speed(orElse(float64(f.VerticalVelError), float64(src.VerticalVelocityErr)))
	}
	out.Position, out.Velocity = encounter.Place(t.frame, p, east, north, up)
	return out
}

// orElse returns v, or what the source's rules bound it by where it was not
// given or claims to be less than nothing.
func orElse(v, bound float64) float64 {
	if v >= 0 && !math.IsInf(v, 1) {
		return v
	}
	return bound
}

// take takes a report in. It replaces an older one only if it lies inside that
// one's reach; otherwise both count.
func (t *tracks) take(f *AircraftSeen, src *SourceRules, r *Rules, at time.Time) {
	key := trackKey{f.Aircraft, f.Source, f.Drill}
	i, known := t.index[key]
	if !known {
		i = len(t.list)
		t.index[key] = i
		t.list = append(t.list, track{key: key})
		t.quiet = append(t.quiet, math.MinInt64)
	}
	k := &t.list[i]
	older := known && f.Said.Before(k.seen.Said)
	k.heard = at
	if !older {
		k.seen, k.ground = *f, f.OnGround
	}
	if !f.Located {
		return // its last reach, if any, goes on growing
	}
	report := t.report(f, src, r)
	if f.OnGround && k.n > 0 && math.Hypot(report.Position.X, report.Position.Y) <= groundKeeps {
		return // near the site a ground state does not end what was in the air
	}
	far := math.Hypot(report.Position.X, report.Position.Y)
	if !older {
		k.inside = !(far > float64(r.Aircraft.DetectionRange))
	}
	next := encounter.Of(&report, &t.motion)
	kept := 0
	for j := 0; j < k.n; j++ {
		if !encounter.Replaces(&k.reaches[j], &report) {
			k.reaches[kept], k.reports[kept] = k.reaches[j], k.reports[j]
			kept++
		}
	}
	// An older report that arrives late adds its reach unless a newer one
	// already answers for the aircraft and could have grown out of it.
	if kept == mostReports {
		k.lost = true
	} else {
		k.reaches[kept], k.reports[kept] = next, *f
		kept++
	}
	k.n = kept
	if kept == 1 {
		k.lost = false
	}
	t.quiet[i] = t.quietUntil(k)
	if !known {
		k.popup = t.quiet[i] <= at.UnixNano()
		if k.popup {
			t.popups++
		}
	}
}

// quietUntil returns the Unix nanoseconds up to which the track cannot touch
// the keep-out of any beam, however it is aimed.
func (t *tracks) quietUntil(k *track) int64 {
	if k.lost || k.n == 0 || len(t.domes) == 0 {
		return math.MinInt64
	}
	until := int64(math.MaxInt64)
	for i := range t.domes {
		for j := 0; j < k.n; j++ {
			q := t.domes[i].Quiet(&k.reaches[j])
			if q.IsZero() {
				return math.MinInt64
			}
			until = min(until, q.Add(-t.guard).UnixNano())
		}
	}
	return until
}

// drop forgets track i.
func (t *tracks) drop(i int) {
	delete(t.index, t.list[i].key)
	last := len(t.list) - 1
	if i != last {
		t.list[i], t.quiet[i] = t.list[last], t.quiet[last]
		t.index[t.list[i].key] = i
	}
	t.list[last] = track{}
	t.list, t.quiet = t.list[:last], t.quiet[:last]
}

// expire drops tracks that were last seen outside the detection range and not
// heard for lost_after. One lost inside stays until it is seen again or
// released by a person.
func (t *tracks) expire(c *Scene, at time.Time) {
	if c.Foreseen == nil {
		return
	}
	after := c.Rules.Aircraft.LostAfter
	for i := 0; i < len(t.list); {
		k := &t.list[i]
		quiet := k.n > 0 && k.inside
		if at.Sub(k.heard) > after && !quiet {
			t.drop(i)
			continue
		}
		i++
	}
}

func (s *State) applyTrackReleased(f TrackReleased, at time.Time) *Error {
	if f.By == "" || f.Spotter == "" {
		return Errorf(Invalid, "say who releases it and which spotter saw that it is gone", "aircraft %.64q: a name is missing", f.Aircraft)
	}
	t := &s.scene.tracks
	released := false
	for i := 0; i < len(t.list); {
		k := &t.list[i]
		if k.key.aircraft == f.Aircraft && (f.Source == "" || k.key.source == f.Source) {
			src := s.rules.Source(k.key.source)
			if src != nil && at.Sub(k.heard) <= src.StaleAfter {
				return Errorf(Conflict, "a track that is still heard ends by its own reports", "aircraft %.64q: it is not lost", f.Aircraft)
			}
			t.drop(i)
			released = true
			continue
		}
		i++
	}
	if !released {
		return Errorf(NotFound, "see which aircraft are known", "aircraft %.64q: not known", f.Aircraft)
	}
	s.durable++
	return nil
}

// durable returns what must outlive a restart of the tracks that were last
// seen inside the detection range: every report whose reach still counts, and
// of a track whose reports contradict each other too often the newest as well,
// so that taking them in again finds the same. In order.
func (t *tracks) durable() []DurableTrack {
	var out []DurableTrack
	for i := range t.list {
		k := &t.list[i]
		if !k.inside || k.n == 0 {
			continue
		}
		for j := 0; j < k.n; j++ {
			out = append(out, DurableTrack{Seen: k.reports[j], Heard: k.heard})
		}
		if k.lost && k.seen.Located {
			out = append(out, DurableTrack{Seen: k.seen, Heard: k.heard})
		}
	}
	slices.SortStableFunc(out, func(a, b DurableTrack) int {
		return cmp.Or(cmp.Compare(a.Seen.Aircraft, b.Seen.Aircraft), cmp.Compare(a.Seen.Source, b.Seen.Source))
	})
	return out
}

// restore takes up what outlived a restart.
func (t *tracks) restore(d []DurableTrack, r *Rules) {
	for i := range d {
		if src := r.Source(d[i].Seen.Source); src != nil && src.Kind == AircraftSource {
			t.take(&d[i].Seen, src, r, d[i].Heard)
		}
	}
}

// aircraft is the check that no place where an aircraft could be, at any
// instant that a permit given now allows for, lies in the beam's keep-out.
type aircraft struct{}

func (aircraft) Code() Code { return CodeAircraft }

// mostTouching bounds how many aircraft one decision names; one is enough to
// shutter.
const mostTouching = 16

func (aircraft) Now(c *Scene, sh *Sheet) {
	first := sh.begin()
	least := Margin{Value: math.Inf(1), Unit: Metre}
	defer func() { sh.finish(CodeAircraft, first, least) }()
	t := &c.tracks
	if len(t.list) == 0 {
		return
	}
	b := c.Beam
	guard := c.Rules.Guard(b.rules)
	volumes := sh.volumes[:0]
	a := b.present()
	for _, l := range b.rules.Launches {
		var v encounter.Volume
		if a != nil {
			if d, e, ok := a.aim.At(c.Night, c.At); ok {
				k := keepOut(c.Rules, b.rules, l)
				k.Axis = d
				k.AxisError += e
				k.AxisRate += s1.Angle(a.aim.ownRate())
				v.Set(&k, c.At, guard) // refused: the whole sky, touched by everything
			}
		}
		volumes = append(volumes, v)
	}
	sh.volumes = volumes
	now := c.At.UnixNano()
	for i, q := range t.quiet {
		if q > now {
			continue
		}
		k := &t.list[i]
		f := Finding{Code: CodeAircraft, Source: k.key.source, Verdict: Violated, Ref: k.key.aircraft, Margin: Margin{Unit: Metre}, Detail: "an aircraft is in the beam's keep-out, or can be before a permit given now is over"}
		f.Over.From, f.Over.Until = c.At, c.At.Add(guard)
		switch {
		case k.n == 0 && !k.lost:
			if c.Rules.Aircraft.Unlocated == UnlocatedShutter {
				f.Verdict, f.Margin, f.Detail = Unknown, UnknownMargin(), "an aircraft gives no position"
				break
			}
			if len(sh.Cautions) < mostTouching {
				sh.Cautions = append(sh.Cautions, Caution{Code: CodeAircraft, Source: k.key.source, Detail: "an aircraft gives no position"})
			}
			continue
		case k.lost:
			f.Verdict, f.Margin, f.Detail = Unknown, UnknownMargin(), "an aircraft's reports contradict each other"
		default:
			touched := false
			for j := 0; j < k.n; j++ {
				answer := encounter.Against(volumes, &k.reaches[j])
				if m := float64(answer.Margin); !(m >= least.Value) {
					least.Value = m
				}
				if !answer.Clear {
					touched = true
					f.Margin.Value = float64(answer.Margin)
					f.Over.From = c.At.Add(answer.NotBefore)
				}
			}
			if !touched {
				continue
			}
			if src := c.Rules.Source(k.key.source); src == nil || c.At.Sub(k.heard) > src.StaleAfter {
				f.Detail = "an aircraft was lost where it can be in the beam's keep-out"
			}
		}
		if len(sh.Found)-first < mostTouching {
			sh.add(f)
		}
	}
}
