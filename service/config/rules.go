package config

import (
	"errors"
	"math"
	"strings"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
)

func (x *number) degrees() s1.Angle           { return s1.Angle(x.value) * s1.Degree }
func (x *number) arcseconds() s1.Angle        { return s1.Angle(x.value) * geometry.Arcsecond }
func (x *number) metres() geometry.Length     { return geometry.Length(x.value) }
func (x *number) nanometres() geometry.Length { return geometry.Length(x.value * 1e-9) }

// rules turns what was read into the core's rules: units become types, words
// become constants. Values that were refused stay zero.
func (b *binder) rules(f *fileKeys) *closures.Rules {
	s, p := &f.Site, &f.Permit
	r := &closures.Rules{
		Site: closures.SiteRules{
			Name: s.Name.value, TimeZone: s.TimeZone.value, Geoid: s.GeoidHeight.metres(),
			Position: earth.Position{Lat: s.Lat.degrees(), Lon: s.Lon.degrees(), Height: s.Height.metres()},
			UT1: sky.UT1{Offset: time.Duration(math.Round(clamp(s.UT1UTC.value) * 1e9)), Until: s.UT1UTCUntil.value,
				Known: s.UT1UTC.has},
			Air: sky.Atmosphere{PressureHPa: s.PressureHPa.value, TemperatureC: s.TemperatureC.value, Known: s.PressureHPa.has},
		},
		Permit: closures.PermitRules{Lease: p.Lease.value, Renew: p.Renew.value,
			DecisionInterval: p.DecisionInterval.value, ConsumerClockError: p.ConsumerClockError.value},
		Clock:    closures.ClockRules{StepLimit: f.Clock.StepLimit.value},
		ByItself: f.Rearm.ByItself.codes,
	}
	if f.Clock.Synchronised.value == "assumed" {
		r.Clock.Synchronised = closures.SyncAssumed
	}
	for i := range f.Beams {
		r.Beams = append(r.Beams, f.Beams[i].rules())
	}
	for i := range f.Authorities {
		r.Authorities = append(r.Authorities, f.Authorities[i].rules())
	}
	for i := range f.Sources {
		r.Sources = append(r.Sources, f.Sources[i].rules())
	}
	for i := range f.Neighbours {
		r.Neighbours = append(r.Neighbours, f.Neighbours[i].rules(r.Site.Position))
	}
	for i := range f.Watches {
		w := &f.Watches[i]
		r.Watches = append(r.Watches, closures.WatchRules{Post: w.Post.value, Minimum: w.Minimum.value,
			Shift: w.Shift.value, Overlap: w.Overlap.value, Required: w.Required.value})
	}
	if f.Aircraft != nil {
		r.Aircraft = f.Aircraft.rules()
	}
	return r
}

// clamp keeps seconds within what a Duration holds; Validate refuses them long
// before.
func clamp(s float64) float64 { return math.Max(-1e9, math.Min(1e9, s)) }

func (k *beamKeys) rules() closures.BeamRules {
	br := closures.BeamRules{
		ID: closures.BeamID(k.ID.value), AimOfTelescope: k.AimOf.value == "telescope",
		Wavelength: k.Wavelength.nanometres(), PowerW: k.Power.value, Aperture: k.Aperture.metres(),
		FocusHeight: k.FocusHeight.metres(), Asterism: k.Asterism.arcseconds(),
		Limits: closures.Limits{ElevationMin: k.Limits.ElevationMin.degrees(), ElevationMax: k.Limits.ElevationMax.degrees(),
			SunBelow: k.Limits.SunBelow.degrees()},
		Aim: closures.AimRules{StaleAfter: k.Aim.StaleAfter.value, Error: k.Aim.Error.arcseconds(),
			UnannouncedMove: k.Aim.UnannouncedMove.degrees()},
		ShutterTime: k.ShutterTime.value, FeedbackRequired: k.ShutterFeedback.value != "optional",
		FeedbackStale: k.ShutterStale.value, ReopenAfter: k.ReopenAfter.value,
	}
	if g := k.GuideStar.rayleigh; g != nil {
		br.GuideStar = closures.GuideStar{Rayleigh: true, From: g.From.metres(), Until: g.Until.metres()}
	}
	for i := range k.Launches {
		l := &k.Launches[i]
		br.Launches = append(br.Launches, closures.Launch{ID: l.ID.value, Offset: r3.Vector{X: l.East.value, Y: l.North.value, Z: l.Up.value}})
	}
	return br
}

func (k *authorityKeys) rules() closures.AuthorityRules {
	ar := closures.AuthorityRules{
		ID: closures.AuthorityID(k.ID.value), Required: k.Required.value, Lead: k.Lead.value, Tail: k.Tail.value,
		Folder: k.Folder.value, Layout: k.Layout.value, Phone: k.Phone.value, SubmitBy: k.SubmitBy.value,
	}
	switch k.Integrity.value {
	case "count":
		ar.Integrity = closures.IntegrityCount
	case "none":
		ar.Integrity = closures.IntegrityNone
	}
	switch k.Loosening.value {
	case "confirm":
		ar.Loosening = closures.LooseningConfirm
	case "at-once":
		ar.Loosening = closures.LooseningAtOnce
	}
	return ar
}

func (k *sourceKeys) rules() closures.SourceRules {
	kind, _ := closures.ParseSourceKind(k.Kind.value)
	sr := closures.SourceRules{ID: closures.Source(k.ID.value), Kind: kind, StaleAfter: k.StaleAfter.value, Required: k.Required.value}
	if kind != closures.AircraftSource {
		return sr
	}
	sr.Latency, sr.WarmUp = k.Latency.value, k.WarmUp.value
	sr.PositionError, sr.VerticalError = k.PositionError.metres(), k.VerticalError.metres()
	sr.VelocityError = geometry.Speed(k.VelocityError.value)
	sr.VerticalVelocityErr = geometry.Speed(k.VerticalVelocityError.value)
	if c := k.Reception; c != nil {
		sr.MinMessagesPerMin, sr.ReferenceAddress = c.MinMessages.value, c.ReferenceAddress.value
	}
	return sr
}

func (k *neighbourKeys) rules(site earth.Position) closures.NeighbourRules {
	nr := closures.NeighbourRules{
		ID: closures.TelescopeID(k.ID.value), Aperture: k.Aperture.metres(), Field: k.Field.degrees(), Halo: k.Halo.degrees(),
		AimError: k.AimError.arcseconds(), StaleAfter: k.StaleAfter.value, IgnoreSilent: k.WhenSilent.value == "ignore",
		ForgetAfter: k.ForgetAfter.value, OnlyExposing: k.OnlyExposing.value,
	}
	switch k.Yields.value {
	case "theirs":
		nr.Yields = closures.YieldsTheirs
	case "later":
		nr.Yields = closures.YieldsLater
	}
	if o := k.Offset; o != nil {
		nr.Offset = r3.Vector{X: o.East.value, Y: o.North.value, Z: o.Up.value}
	} else if p := k.Position; p != nil {
		at := earth.Position{Lat: p.Lat.degrees(), Lon: p.Lon.degrees(), Height: p.Height.metres()}
		nr.Offset = earth.FrameAt(site).ENU(at.ECEF())
	}
	for i := range k.Passbands {
		p := &k.Passbands[i]
		nr.Passbands = append(nr.Passbands, closures.Band{From: p.from.nanometres(), Until: p.until.nanometres()})
	}
	return nr
}

func (k *aircraftKeys) rules() closures.AircraftRules {
	a := closures.AircraftRules{
		Configured:       true,
		KeepOutHalfAngle: k.KeepOut.HalfAngle.degrees(), KeepOutRadius: k.KeepOut.Radius.metres(), KeepOutCeiling: k.KeepOut.Ceiling.metres(),
		HorizontalAccel: geometry.Acceleration(k.Motion.Horizontal.value), VerticalAccel: geometry.Acceleration(k.Motion.Vertical.value),
		SpeedMax: geometry.Speed(k.Motion.SpeedMax.value), ClimbMax: geometry.Speed(k.Motion.ClimbMax.value),
		LostAfter: k.LostAfter.value, WatchRange: k.WatchRange.metres(), DetectionRange: k.DetectionRange.metres(),
	}
	if k.Unlocated.value == "alarm" {
		a.Unlocated = closures.UnlocatedAlarm
	}
	return a
}

// validate asks the core whether the rules can be met, and shows each of its
// problems where and as the value was written. What follows only from a value
// that was refused already is left out.
func (b *binder) validate(r *closures.Rules) {
	var found closures.Problems
	if !errors.As(r.Validate(), &found) {
		return
	}
	trust := map[string]bool{}
	for _, p := range found {
		trust[p.Key] = b.trusted(p.Key) && (p.Beside == "" || b.trusted(p.Beside))
	}
	for _, p := range found {
		if !trust[p.Key] {
			continue
		}
		at, value := b.nearest(p.Key), p.Value
		if at.line == 0 && p.Beside != "" {
			at.line = b.nearest(p.Beside).line
		}
		if at.key == p.Key && at.text != "" {
			value = shown(at.text)
		}
		b.problems = append(b.problems, Problem{Line: at.line, Key: p.Key, Value: value, Mend: p.Mend})
	}
	for _, p := range found {
		b.spoiled[section(p.Key)] = true
	}
}

// nearest finds where a key stands, or the closest section around it.
func (b *binder) nearest(key string) at {
	found := b.where[key]
	for k := key; found.line == 0; {
		i := strings.LastIndexAny(k, ".[")
		if i < 0 {
			break
		}
		k = k[:i]
		if a := b.where[k]; a.line > 0 {
			found = at{key: found.key, text: found.text, line: a.line}
		}
	}
	return found
}
