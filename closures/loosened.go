package closures

import (
	"cmp"
	"reflect"
	"slices"
)

// Loosened names the keys of config by which rules next are not proven to be
// at least as tight as r: an authority, source, neighbour or post that went, a
// bound that moved the wrong way, and whatever else changed without a rule
// that says which way is tighter. None of them means that next opens nothing
// that r closes, for the same facts.
func (r *Rules) Loosened(next *Rules) []string {
	var l loosened
	l.same("site", siteKey(&r.Site), siteKey(&next.Site))
	l.same("permit.decision_interval", r.Permit.DecisionInterval, next.Permit.DecisionInterval)
	l.same("permit.renew", r.Permit.Renew, next.Permit.Renew)
	l.mayFall("permit.lease", float64(r.Permit.Lease), float64(next.Permit.Lease))
	l.mayRise("permit.consumer_clock_error", float64(r.Permit.ConsumerClockError), float64(next.Permit.ConsumerClockError))
	l.mayFall("clock.synchronised", float64(r.Clock.Synchronised), float64(next.Clock.Synchronised))
	l.mayFall("clock.step_limit", float64(r.Clock.StepLimit), float64(next.Clock.StepLimit))
	l.when("rearm.by_itself", next.ByItself&^r.ByItself != 0)
	l.beams(r, next)
	l.authorities(r, next)
	l.sources(r, next)
	l.neighbours(r, next)
	l.aircraft(&r.Aircraft, &next.Aircraft)
	l.watches(r, next)
	slices.Sort(l)
	return slices.Compact(l)
}

// loosened gathers keys.
type loosened []string

func (l *loosened) when(key string, is bool) {
	if is {
		*l = append(*l, key)
	}
}

// mayRise takes a rise as tightening. What is not a number is not proven.
func (l *loosened) mayRise(key string, old, next float64) { l.when(key, !(next >= old)) }

func (l *loosened) mayFall(key string, old, next float64) { l.when(key, !(next <= old)) }

// same takes any change as loosening.
func (l *loosened) same(key string, old, next any) { l.when(key, !reflect.DeepEqual(old, next)) }

// siteKey is what of a site bears on decisions.
func siteKey(s *SiteRules) SiteRules {
	k := *s
	k.Name, k.TimeZone = "", ""
	return k
}

func (l *loosened) beams(r, next *Rules) {
	for i := range next.Beams {
		n := &next.Beams[i]
		o, key := r.Beam(n.ID), "beams["+string(n.ID)+"]."
		if o == nil {
			l.when("beams["+string(n.ID)+"]", true) // a beam that was none could not open
			continue
		}
		l.mayRise(key+"limits.elevation_min_deg", float64(o.Limits.ElevationMin), float64(n.Limits.ElevationMin))
		l.mayFall(key+"limits.elevation_max_deg", float64(o.Limits.ElevationMax), float64(n.Limits.ElevationMax))
		l.mayFall(key+"limits.sun_below_deg", float64(o.Limits.SunBelow), float64(n.Limits.SunBelow))
		l.mayFall(key+"aim.stale_after", float64(o.Aim.StaleAfter), float64(n.Aim.StaleAfter))
		l.mayRise(key+"aim.error_arcsec", float64(o.Aim.Error), float64(n.Aim.Error))
		l.same(key+"aim.unannounced_move_deg", o.Aim.UnannouncedMove, n.Aim.UnannouncedMove)
		l.mayRise(key+"asterism_radius_arcsec", float64(o.Asterism), float64(n.Asterism))
		l.mayRise(key+"shutter_time", float64(o.ShutterTime), float64(n.ShutterTime))
		l.when(key+"shutter_feedback", o.FeedbackRequired && !n.FeedbackRequired)
		l.mayFall(key+"shutter_stale_after", float64(o.FeedbackStale), float64(n.FeedbackStale))
		l.mayRise(key+"reopen_after", float64(o.ReopenAfter), float64(n.ReopenAfter))
		l.mayRise(key+"aperture_m", float64(o.Aperture), float64(n.Aperture))
		l.same(key+"launches", o.Launches, n.Launches)
		l.same(key+"aim_of", o.AimOfTelescope, n.AimOfTelescope)
		l.same(key+"guide_star", o.GuideStar, n.GuideStar)
		l.same(key+"wavelength_nm", o.Wavelength, n.Wavelength)
		l.same(key+"focus_height_m", o.FocusHeight, n.FocusHeight)
	}
}

func (l *loosened) authorities(r, next *Rules) {
	for i := range r.Authorities {
		o := &r.Authorities[i]
		n, key := next.Authority(o.ID), "authorities["+string(o.ID)+"]"
		if n == nil {
			l.when(key, true)
			continue
		}
		l.when(key+".required", o.Required && !n.Required)
		l.mayFall(key+".integrity", float64(o.Integrity), float64(n.Integrity))
		l.mayRise(key+".lead", float64(o.Lead), float64(n.Lead))
		l.mayRise(key+".tail", float64(o.Tail), float64(n.Tail))
		l.mayFall(key+".loosening", float64(o.Loosening), float64(n.Loosening))
	}
}

func (l *loosened) sources(r, next *Rules) {
	for i := range r.Sources {
		o := &r.Sources[i]
		n, key := next.Source(o.ID), "sources["+string(o.ID)+"]"
		if n == nil {
			l.when(key, true)
			continue
		}
		l.same(key+".kind", o.Kind, n.Kind)
		l.when(key+".required", o.Required && !n.Required)
		l.mayFall(key+".stale_after", float64(o.StaleAfter), float64(n.StaleAfter))
		l.mayRise(key+".latency", float64(o.Latency), float64(n.Latency))
		l.mayRise(key+".warm_up", float64(o.WarmUp), float64(n.WarmUp))
		l.mayRise(key+".reception.min_messages_per_min", o.MinMessagesPerMin, n.MinMessagesPerMin)
		l.same(key+".reception.reference_address", o.ReferenceAddress, n.ReferenceAddress)
		l.mayRise(key+".position_error_m", float64(o.PositionError), float64(n.PositionError))
		l.mayRise(key+".vertical_error_m", float64(o.VerticalError), float64(n.VerticalError))
		l.mayRise(key+".velocity_error_mps", float64(o.VelocityError), float64(n.VelocityError))
		l.mayRise(key+".vertical_velocity_error_mps", float64(o.VerticalVelocityErr), float64(n.VerticalVelocityErr))
	}
}

func (l *loosened) neighbours(r, next *Rules) {
	for i := range r.Neighbours {
		o := &r.Neighbours[i]
		n, key := next.Neighbour(o.ID), "neighbours["+string(o.ID)+"]"
		if n == nil {
			l.when(key, true)
			continue
		}
		l.same(key+".offset", o.Offset, n.Offset)
		l.mayRise(key+".aperture_m", float64(o.Aperture), float64(n.Aperture))
		l.mayRise(key+".field_radius_deg", float64(o.Field), float64(n.Field))
		l.mayRise(key+".halo_deg", float64(o.Halo), float64(n.Halo))
		l.mayRise(key+".aim_error_arcsec", float64(o.AimError), float64(n.AimError))
		l.mayFall(key+".stale_after", float64(o.StaleAfter), float64(n.StaleAfter))
		l.when(key+".when_silent", !o.IgnoreSilent && n.IgnoreSilent)
		l.mayRise(key+".forget_after", float64(o.ForgetAfter), float64(n.ForgetAfter))
		l.when(key+".yields", n.Yields != o.Yields && n.Yields != YieldsOurs)
		l.when(key+".passbands_nm", len(n.Passbands) > 0 && !slices.Equal(o.Passbands, n.Passbands))
		l.when(key+".only_exposing", !o.OnlyExposing && n.OnlyExposing)
	}
}

func (l *loosened) aircraft(o, n *AircraftRules) {
	if !o.Configured {
		return // what comes new can only close
	}
	if !n.Configured {
		l.when("aircraft", true)
		return
	}
	l.mayRise("aircraft.keep_out.half_angle_deg", float64(o.KeepOutHalfAngle), float64(n.KeepOutHalfAngle))
	l.mayRise("aircraft.keep_out.radius_m", float64(o.KeepOutRadius), float64(n.KeepOutRadius))
	l.mayRise("aircraft.keep_out.ceiling_m", float64(o.KeepOutCeiling), float64(n.KeepOutCeiling))
	l.mayRise("aircraft.motion.horizontal_mps2", float64(o.HorizontalAccel), float64(n.HorizontalAccel))
	l.mayRise("aircraft.motion.vertical_mps2", float64(o.VerticalAccel), float64(n.VerticalAccel))
	l.mayRise("aircraft.motion.speed_max_mps", float64(o.SpeedMax), float64(n.SpeedMax))
	l.mayRise("aircraft.motion.climb_max_mps", float64(o.ClimbMax), float64(n.ClimbMax))
	l.when("aircraft.unlocated", o.Unlocated == UnlocatedShutter && n.Unlocated != UnlocatedShutter)
	l.mayRise("aircraft.lost_after", float64(o.LostAfter), float64(n.LostAfter))
	l.mayRise("aircraft.watch_range_m", float64(o.WatchRange), float64(n.WatchRange))
	l.mayRise("aircraft.detection_range_m", float64(o.DetectionRange), float64(n.DetectionRange))
}

func (l *loosened) watches(r, next *Rules) {
	for i := range r.Watches {
		o := &r.Watches[i]
		j := slices.IndexFunc(next.Watches, func(w WatchRules) bool { return w.Post == o.Post })
		key := "watches[" + o.Post + "]"
		if j < 0 {
			l.when(key, true)
			continue
		}
		n := &next.Watches[j]
		l.mayRise(key+".minimum", float64(o.Minimum), float64(n.Minimum))
		l.mayFall(key+".shift", float64(o.Shift), float64(n.Shift))
		l.when(key+".required", o.Required && !n.Required)
		l.when(key+".overlap", cmp.Compare(n.Overlap, o.Overlap) < 0)
	}
}
