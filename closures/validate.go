package closures

import (
	"fmt"
	"math"
	"sort"
	"strconv"
	"strings"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/sky"
)

// Bounds of what rules may ask for. Each is wide for any installation that is
// built today, and narrow enough that a slip of the unit falls outside it.
const (
	MaxLease            = 10 * time.Second
	MinDecisionInterval = 10 * time.Millisecond
	MaxShutterTime      = 30 * time.Second
	MaxLaunchDistance   = 1000.0 // metres from the site
	MaxNeighbourRange   = 200e3  // metres from the site
	MaxLeadOrTail       = time.Hour

	maxOfAKind = 256 // beams, sources, neighbours, posts or authorities
)

// Problem is one setting that cannot be met: which, what it says, and what to
// write instead.
type Problem struct {
	Key    string // as in the configuration, such as beams[north].limits.elevation_min_deg
	Value  string // in the key's unit; empty: it is missing
	Mend   string
	Beside string // another key that the value was compared with; empty: none
}

// String returns "key: value: mend".
func (p Problem) String() string {
	if p.Value == "" {
		return p.Key + ": " + p.Mend
	}
	return p.Key + ": " + p.Value + ": " + p.Mend
}

// Problems is everything that is wrong with rules, in order of the keys.
type Problems []Problem

// Error returns one problem a line.
func (p Problems) Error() string {
	lines := make([]string, len(p))
	for i := range p {
		lines[i] = p[i].String()
	}
	return strings.Join(lines, "\n")
}

// Validate says whether the rules can be met. The error is Problems, with all
// of them; nothing is repaired. A number that is not finite meets no bound.
func (r *Rules) Validate() error {
	var in inspection
	if r == nil {
		in.refuse("rules", "", "there are none")
		return in.found
	}
	in.site(r)
	in.permit(r)
	in.names(r)
	for i := range r.Beams {
		in.beam(r, i)
	}
	for i := range r.Authorities {
		in.authority(r, i)
	}
	for i := range r.Sources {
		in.source(r, i)
	}
	for i := range r.Neighbours {
		in.neighbour(r, i)
	}
	for i := range r.Watches {
		in.watch(r, i)
	}
	in.aircraft(r)
	if len(in.found) == 0 {
		return nil
	}
	sort.SliceStable(in.found, func(i, j int) bool { return in.found[i].Key < in.found[j].Key })
	return in.found
}

func (in *inspection) site(r *Rules) {
	s := &r.Site
	in.must(s.Name != "" && len(s.Name) <= 200, "site.name", quotedText(s.Name), "give the site a name of at most 200 bytes")
	in.must(s.TimeZone != "", "site.time_zone", "", "name the site's zone, such as Atlantic/St_Helena or UTC")
	in.degrees("site.lat_deg", s.Position.Lat, -90, 90)
	in.degrees("site.lon_deg", s.Position.Lon, -180, 360)
	in.metres("site.height_m", s.Position.Height, -500, 9000)
	in.metres("site.geoid_height_m", s.Geoid, -120, 100) // EGM2008 spans -107 to 86 m
	in.must(s.UT1.Offset >= -sky.MaxUT1Offset && s.UT1.Offset <= sky.MaxUT1Offset,
		"site.ut1_utc_s", plainNumber(s.UT1.Offset.Seconds()), "make it -0.9 to 0.9, from the newest IERS Bulletin A or D")
	in.must(!s.UT1.Known || !s.UT1.Until.IsZero(), "site.ut1_utc_until", "", "say until when ut1_utc_s holds")
	if s.Air.Known {
		// The usual slip is a pressure reduced to sea level, which would bend
		// too much; weather moves it by less than a tenth.
		usual := 1013.25 * math.Exp(-float64(s.Position.Height)/8434)
		in.within("site.pressure_hpa", s.Air.PressureHPa, math.Max(100, math.Ceil(0.88*usual)), math.Min(1100, math.Floor(1.12*usual)))
		in.within("site.temperature_c", s.Air.TemperatureC, -90, 60)
	}
	in.must(r.ByItself&^AllCodes == 0, "rearm.by_itself", fmt.Sprintf("%#x", uint32(r.ByItself)), "name codes that exist")
}

func (in *inspection) permit(r *Rules) {
	p := &r.Permit
	in.spanOf("permit.renew", p.Renew, 10*time.Millisecond, MaxLease)
	in.spanOf("permit.consumer_clock_error", p.ConsumerClockError, 0, 10*time.Second)
	if in.must(p.Lease > 0 && p.Lease <= MaxLease, "permit.lease", plainDuration(p.Lease), "make it more than 0s and at most "+plainDuration(MaxLease)) {
		in.must(p.DecisionInterval >= MinDecisionInterval && p.DecisionInterval <= p.Lease/4,
			"permit.decision_interval", plainDuration(p.DecisionInterval),
			fmt.Sprintf("make it %s to %s, a quarter of permit.lease", plainDuration(MinDecisionInterval), plainDuration(p.Lease/4)))
		if need := p.Renew + p.DecisionInterval + p.ConsumerClockError; need > 0 {
			in.must(p.Lease >= need, "permit.lease", plainDuration(p.Lease),
				fmt.Sprintf("make it at least %s, permit.renew with permit.decision_interval and permit.consumer_clock_error, or a good reader loses its permit between two reads", plainDuration(need)))
		}
	}
	c := &r.Clock
	in.must(c.Synchronised <= SyncAssumed, "clock.synchronised", strconv.Itoa(int(c.Synchronised)), "make it required or assumed")
	in.must(c.StepLimit > 0 && c.StepLimit <= time.Second, "clock.step_limit", plainDuration(c.StepLimit), "make it more than 0s and at most 1s")
}

// names sees to it that a name denotes one thing: feeds and tokens are bound
// to what they may speak for by name alone.
func (in *inspection) names(r *Rules) {
	in.must(len(r.Beams) > 0, "beams", "", "describe at least one beam")
	taken := map[string]string{}
	name := func(list, idKey, id string) {
		key := list + "[" + id + "]"
		if !in.must(ValidName(id), key+"."+idKey, quotedText(id), "make it 1 to 64 of the characters A-Z a-z 0-9 . _ -") {
			return
		}
		folded := strings.ToLower(id)
		if first, ok := taken[folded]; ok {
			in.found = append(in.found, Problem{Key: key + "." + idKey, Value: id, Beside: first,
				Mend: "choose another name: " + first + " has it, and a name denotes one thing, whatever its case"})
			return
		}
		taken[folded] = key
	}
	count := func(list string, n int) {
		in.must(n <= maxOfAKind, list, strconv.Itoa(n)+" entries", "describe at most "+strconv.Itoa(maxOfAKind))
	}
	count("beams", len(r.Beams))
	for i := range r.Beams {
		name("beams", "id", string(r.Beams[i].ID))
	}
	count("authorities", len(r.Authorities))
	for i := range r.Authorities {
		name("authorities", "id", string(r.Authorities[i].ID))
	}
	count("sources", len(r.Sources))
	for i := range r.Sources {
		name("sources", "id", string(r.Sources[i].ID))
	}
	count("neighbours", len(r.Neighbours))
	for i := range r.Neighbours {
		name("neighbours", "id", string(r.Neighbours[i].ID))
	}
	count("watches", len(r.Watches))
	for i := range r.Watches {
		name("watches", "post", r.Watches[i].Post)
	}
}

func (in *inspection) beam(r *Rules, i int) {
	b := &r.Beams[i]
	k := "beams[" + string(b.ID) + "]."

	in.must(len(b.Launches) >= 1 && len(b.Launches) <= 16, k+"launches", strconv.Itoa(len(b.Launches))+" entries", "describe 1 to 16 launches")
	seen := map[string]bool{}
	for _, l := range b.Launches {
		lk := k + "launches[" + l.ID + "]"
		in.must(ValidName(l.ID), lk+".id", quotedText(l.ID), "make it 1 to 64 of the characters A-Z a-z 0-9 . _ -")
		in.must(!seen[strings.ToLower(l.ID)], lk+".id", l.ID, "choose another name: another launch of the beam has it")
		seen[strings.ToLower(l.ID)] = true
		in.offset(lk, l.Offset, MaxLaunchDistance)
	}

	nm := float64(b.Wavelength) * 1e9
	if b.GuideStar.Rayleigh {
		in.within(k+"wavelength_nm", nm, 300, 1100)
		g := &b.GuideStar
		in.must(g.From > r.Site.Position.Height && g.From < 100e3, k+"guide_star.rayleigh.from_m", plainNumber(float64(g.From)), "make it a height above the site and under 100000")
		in.must(g.Until > g.From && g.Until <= 100e3, k+"guide_star.rayleigh.until_m", plainNumber(float64(g.Until)), "make it more than from_m and at most 100000")
	} else {
		// Sodium's D lines lie at 589.158 and 589.756 nm in vacuum.
		in.must(nm >= 588.5 && nm <= 590, k+"wavelength_nm", plainNumber(nm), "make it 588.5 to 590 for a sodium star, or describe a rayleigh guide_star")
		in.must(b.GuideStar.From == 0 && b.GuideStar.Until == 0, k+"guide_star", "sodium", "leave the heights out: they belong to a rayleigh star")
	}
	in.within(k+"power_w", b.PowerW, 0.001, 1000)
	in.metres(k+"aperture_m", b.Aperture, 0.01, 10)
	in.must(b.FocusHeight > r.Site.Position.Height && b.FocusHeight <= 400e3, k+"focus_height_m", plainNumber(float64(b.FocusHeight)), "make it a height above the site and at most 400000")
	in.must(b.Asterism >= 0 && b.Asterism < s1.Degree, k+"asterism_radius_arcsec", plainNumber(float64(b.Asterism/geometry.Arcsecond)), "make it 0 to less than 3600, one degree")

	l := &b.Limits
	in.degrees(k+"limits.elevation_min_deg", l.ElevationMin, 0, 90)
	if in.degrees(k+"limits.elevation_max_deg", l.ElevationMax, 0, 90) {
		in.must(l.ElevationMax > l.ElevationMin, k+"limits.elevation_max_deg", plainNumber(l.ElevationMax.Degrees()), "make it more than elevation_min_deg, "+plainNumber(l.ElevationMin.Degrees()))
	}
	in.degrees(k+"limits.sun_below_deg", l.SunBelow, -90, 90)

	a := &b.Aim
	in.beside(a.StaleAfter > r.Permit.DecisionInterval && a.StaleAfter <= 5*time.Minute, k+"aim.stale_after", plainDuration(a.StaleAfter),
		"make it more than permit.decision_interval, "+plainDuration(r.Permit.DecisionInterval)+", and at most 5m", "permit.decision_interval")
	in.must(a.Error >= 0 && a.Error <= 5*s1.Degree, k+"aim.error_arcsec", plainNumber(float64(a.Error/geometry.Arcsecond)), "make it 0 to 18000")
	in.must(a.UnannouncedMove > 0 && a.UnannouncedMove <= 5*s1.Degree, k+"aim.unannounced_move_deg", plainNumber(a.UnannouncedMove.Degrees()), "make it more than 0 and at most 5")

	in.must(b.ShutterTime > 0 && b.ShutterTime <= MaxShutterTime, k+"shutter_time", plainDuration(b.ShutterTime), "make it more than 0s and at most "+plainDuration(MaxShutterTime))
	in.beside(b.FeedbackStale > r.Permit.DecisionInterval && b.FeedbackStale <= time.Minute, k+"shutter_stale_after", plainDuration(b.FeedbackStale),
		"make it more than permit.decision_interval, "+plainDuration(r.Permit.DecisionInterval)+", and at most 1m", "permit.decision_interval")
	in.must(b.ReopenAfter > 0 && b.ReopenAfter <= time.Hour, k+"reopen_after", plainDuration(b.ReopenAfter), "make it more than 0s and at most 1h")
}

func (in *inspection) authority(r *Rules, i int) {
	a := &r.Authorities[i]
	k := "authorities[" + string(a.ID) + "]."
	in.spanOf(k+"lead", a.Lead, 0, MaxLeadOrTail)
	in.spanOf(k+"tail", a.Tail, 0, MaxLeadOrTail)
	in.must(a.Integrity <= IntegrityNone, k+"integrity", strconv.Itoa(int(a.Integrity)), "make it digest, count or none")
	in.must(a.Loosening <= LooseningAtOnce, k+"loosening", strconv.Itoa(int(a.Loosening)), "make it second-person, confirm or at-once")
	for j := range r.Authorities[:i] {
		if o := &r.Authorities[j]; a.Folder != "" && a.Folder == o.Folder {
			in.beside(false, k+"folder", a.Folder, "choose another folder: "+string(o.ID)+" has it, and a list must not be read for two authorities", "authorities["+string(o.ID)+"].folder")
			break
		}
	}
	in.must(a.SubmitBy == "" || isTimeOfDay(a.SubmitBy), k+"submit_by", quotedText(a.SubmitBy), `make it hh:mm in the site's zone, "00:00" to "23:59"`)
}

func (in *inspection) source(r *Rules, i int) {
	s := &r.Sources[i]
	k := "sources[" + string(s.ID) + "]."
	in.must(s.Kind > NoKind && s.Kind <= WeatherSource, k+"kind", s.Kind.String(), "make it one of "+strings.Join(sourceKinds[1:], ", "))
	in.beside(s.StaleAfter > r.Permit.DecisionInterval && s.StaleAfter <= 24*time.Hour, k+"stale_after", plainDuration(s.StaleAfter),
		"make it more than permit.decision_interval, "+plainDuration(r.Permit.DecisionInterval)+", and at most 24h", "permit.decision_interval")
	if s.Kind != AircraftSource {
		o := SourceRules{ID: s.ID, Kind: s.Kind, StaleAfter: s.StaleAfter, Required: s.Required}
		in.must(*s == o, k+"kind", s.Kind.String(), "leave latency, warm_up, reception and the error bounds to sources of kind aircraft")
		return
	}
	in.must(s.Latency > 0 && s.Latency <= time.Minute, k+"latency", plainDuration(s.Latency), "make it more than 0s and at most 1m")
	in.must(s.StaleAfter >= s.Latency, k+"stale_after", plainDuration(s.StaleAfter), "make it at least the source's latency, "+plainDuration(s.Latency))
	in.must(s.WarmUp > 0 && s.WarmUp <= time.Hour, k+"warm_up", plainDuration(s.WarmUp), "make it more than 0s and at most 1h")
	in.within(k+"reception.min_messages_per_min", s.MinMessagesPerMin, 0, 1e6)
	in.must(s.ReferenceAddress == "" || isAddress24(s.ReferenceAddress), k+"reception.reference_address", quotedText(s.ReferenceAddress), "make it a 24-bit address: six digits of 0-9 a-f")
	in.metres(k+"position_error_m", s.PositionError, 1, 50e3)
	in.metres(k+"vertical_error_m", s.VerticalError, 1, 10e3)
	in.within(k+"velocity_error_mps", float64(s.VelocityError), 0.1, 1000)
	in.within(k+"vertical_velocity_error_mps", float64(s.VerticalVelocityErr), 0.1, 1000)
}

func (in *inspection) neighbour(r *Rules, i int) {
	n := &r.Neighbours[i]
	k := "neighbours[" + string(n.ID) + "]"
	in.offset(k+".offset", n.Offset, MaxNeighbourRange)
	in.metres(k+".aperture_m", n.Aperture, 0.01, 100)
	in.must(n.Field > 0 && n.Field <= 10*s1.Degree, k+".field_radius_deg", plainNumber(n.Field.Degrees()), "make it more than 0 and at most 10")
	in.degrees(k+".halo_deg", n.Halo, 0, 10)
	in.must(n.AimError >= 0 && n.AimError <= 5*s1.Degree, k+".aim_error_arcsec", plainNumber(float64(n.AimError/geometry.Arcsecond)), "make it 0 to 18000")
	in.beside(n.StaleAfter > r.Permit.DecisionInterval && n.StaleAfter <= time.Hour, k+".stale_after", plainDuration(n.StaleAfter),
		"make it more than permit.decision_interval, "+plainDuration(r.Permit.DecisionInterval)+", and at most 1h", "permit.decision_interval")
	in.must(n.ForgetAfter >= n.StaleAfter && n.ForgetAfter <= 24*time.Hour, k+".forget_after", plainDuration(n.ForgetAfter),
		"make it at least stale_after, "+plainDuration(n.StaleAfter)+", and at most 24h")
	in.must(n.Yields <= YieldsLater, k+".yields", strconv.Itoa(int(n.Yields)), "make it ours, theirs or later")
	in.must(len(n.Passbands) <= 32, k+".passbands_nm", strconv.Itoa(len(n.Passbands))+" entries", "state at most 32")
	for _, b := range n.Passbands {
		from, until := float64(b.From)*1e9, float64(b.Until)*1e9
		in.must(from >= 100 && until > from && until <= 100e3, k+".passbands_nm", "["+plainNumber(from)+", "+plainNumber(until)+"]", "make each a rising pair of wavelengths from 100 to 100000")
	}
}

func (in *inspection) watch(r *Rules, i int) {
	w := &r.Watches[i]
	k := "watches[" + w.Post + "]."
	in.must(w.Minimum >= 1 && w.Minimum <= 20, k+"minimum", strconv.Itoa(w.Minimum), "make it 1 to 20 people")
	in.must(w.Shift > 0 && w.Shift <= 24*time.Hour, k+"shift", plainDuration(w.Shift), "make it more than 0s and at most 24h")
	in.must(w.Overlap >= 0 && w.Overlap < w.Shift, k+"overlap", plainDuration(w.Overlap), "make it 0s to less than the shift, "+plainDuration(w.Shift))
}

func (in *inspection) aircraft(r *Rules) {
	a := &r.Aircraft
	source := ""
	for i := range r.Sources {
		if r.Sources[i].Kind == AircraftSource {
			source = "sources[" + string(r.Sources[i].ID) + "]"
			break
		}
	}
	if !a.Configured {
		in.beside(source == "", "aircraft", "", "describe keep_out and motion: "+source+" tells of aircraft", source)
		return
	}
	in.beside(source != "", "aircraft", "described", "add a source of kind aircraft, or take the section out", "sources")

	in.must(a.KeepOutHalfAngle > 0 && a.KeepOutHalfAngle <= 45*s1.Degree, "aircraft.keep_out.half_angle_deg", plainNumber(a.KeepOutHalfAngle.Degrees()), "make it more than 0 and at most 45")
	in.metres("aircraft.keep_out.radius_m", a.KeepOutRadius, 1, 10e3)
	ceiling := in.must(a.KeepOutCeiling > r.Site.Position.Height && a.KeepOutCeiling <= 60e3, "aircraft.keep_out.ceiling_m", plainNumber(float64(a.KeepOutCeiling)), "make it a height above the site and at most 60000")
	in.within("aircraft.motion.horizontal_mps2", float64(a.HorizontalAccel), 1, 200)
	in.within("aircraft.motion.vertical_mps2", float64(a.VerticalAccel), 0.5, 200)
	in.within("aircraft.motion.speed_max_mps", float64(a.SpeedMax), 50, 2000)
	in.within("aircraft.motion.climb_max_mps", float64(a.ClimbMax), 5, 1000)
	in.must(a.Unlocated <= UnlocatedAlarm, "aircraft.unlocated", strconv.Itoa(int(a.Unlocated)), "make it shutter or alarm")
	in.must(a.DetectionRange > 0 && a.DetectionRange <= 1000e3, "aircraft.detection_range_m", plainNumber(float64(a.DetectionRange)), "make it more than 0 and at most 1000000")
	in.must(a.WatchRange >= a.DetectionRange && a.WatchRange <= 1000e3, "aircraft.watch_range_m", plainNumber(float64(a.WatchRange)),
		"make it at least detection_range_m, "+plainNumber(float64(a.DetectionRange))+", and at most 1000000")

	longest := time.Duration(0)
	for i := range r.Beams {
		b := &r.Beams[i]
		longest = max(longest, r.Guard(b))
		// An aircraft lost inside the keep-out must stay a closure, so the
		// keep-out's lowest edge has to lie inside the detection range up to
		// the ceiling. Below 1° the slant is taken at 1°.
		low := math.Max(float64(b.Limits.ElevationMin-a.KeepOutHalfAngle), float64(s1.Degree))
		if reach := float64(a.KeepOutCeiling-r.Site.Position.Height)/math.Sin(low) + float64(a.KeepOutRadius); ceiling {
			in.beside(float64(a.DetectionRange) >= reach, "aircraft.detection_range_m", plainNumber(float64(a.DetectionRange)),
				fmt.Sprintf("make it at least %.0f, where the keep-out of beam %s passes its ceiling at the lowest elevation", math.Ceil(reach), b.ID), "beams["+string(b.ID)+"].limits.elevation_min_deg")
		}
	}
	in.beside(a.LostAfter >= longest && a.LostAfter > 0 && a.LostAfter <= time.Hour, "aircraft.lost_after", plainDuration(a.LostAfter),
		"make it at least "+plainDuration(longest)+", the longest lease with its margin time, and at most 1h", "permit.lease")
}

// inspection gathers problems.
type inspection struct{ found Problems }

func (in *inspection) refuse(key, value, mend string) {
	in.found = append(in.found, Problem{Key: key, Value: value, Mend: mend})
}

// must records a problem unless ok, and returns ok. Callers state what has to
// hold, so that not-a-number does not.
func (in *inspection) must(ok bool, key, value, mend string) bool {
	if !ok {
		in.refuse(key, value, mend)
	}
	return ok
}

func (in *inspection) beside(ok bool, key, value, mend, other string) {
	if !ok {
		in.found = append(in.found, Problem{Key: key, Value: value, Mend: mend, Beside: other})
	}
}

func (in *inspection) within(key string, x, least, most float64) bool {
	return in.must(x >= least && x <= most, key, plainNumber(x), "make it "+plainNumber(least)+" to "+plainNumber(most))
}

func (in *inspection) metres(key string, x geometry.Length, least, most float64) bool {
	return in.within(key, float64(x), least, most)
}

// degrees compares in radians, made from degrees as a reader makes them, so
// that a bound itself is inside.
func (in *inspection) degrees(key string, x s1.Angle, least, most float64) bool {
	return in.must(x >= s1.Angle(least)*s1.Degree && x <= s1.Angle(most)*s1.Degree, key, plainNumber(x.Degrees()), "make it "+plainNumber(least)+" to "+plainNumber(most))
}

func (in *inspection) spanOf(key string, d, least, most time.Duration) bool {
	return in.must(d >= least && d <= most, key, plainDuration(d), "make it "+plainDuration(least)+" to "+plainDuration(most))
}

// offset wants a finite vector no longer than most metres.
func (in *inspection) offset(key string, v r3.Vector, most float64) {
	in.must(v.Norm() <= most, key, fmt.Sprintf("%s m east, %s m north, %s m up", plainNumber(v.X), plainNumber(v.Y), plainNumber(v.Z)),
		"place it within "+plainNumber(most)+" m of the site")
}

// plainNumber writes a number without an exponent where that is shorter to read.
// Ten digits hide what the turn from degrees to radians and back leaves.
func plainNumber(x float64) string {
	s := strconv.FormatFloat(x, 'g', 10, 64)
	if y, err := strconv.ParseFloat(s, 64); err == nil && y == math.Trunc(y) && math.Abs(y) < 1e12 {
		return strconv.FormatFloat(y, 'f', 0, 64)
	}
	return s
}

// plainDuration writes a whole number of the largest unit that fits.
func plainDuration(d time.Duration) string {
	for _, u := range []struct {
		size time.Duration
		name string
	}{{time.Hour, "h"}, {time.Minute, "m"}, {time.Second, "s"}, {time.Millisecond, "ms"}} {
		if d != 0 && d%u.size == 0 {
			return strconv.FormatInt(int64(d/u.size), 10) + u.name
		}
	}
	return d.String()
}

// quotedText shows a text that may hold anything, or nothing.
func quotedText(s string) string {
	if len(s) > 80 {
		s = s[:80]
	}
	return strconv.Quote(s)
}

func isTimeOfDay(s string) bool {
	return len(s) == 5 && s[0] >= '0' && s[0] <= '2' && s[1] >= '0' && s[1] <= '9' && (s[0] < '2' || s[1] <= '3') &&
		s[2] == ':' && s[3] >= '0' && s[3] <= '5' && s[4] >= '0' && s[4] <= '9'
}

func isAddress24(s string) bool {
	if len(s) != 6 {
		return false
	}
	for i := 0; i < len(s); i++ {
		if c := s[i]; (c < '0' || c > '9') && (c < 'a' || c > 'f') {
			return false
		}
	}
	return true
}
