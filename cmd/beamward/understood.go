package main

import (
	"fmt"
	"strings"

	"beamward/closures"
	"beamward/service/config"
)

// understood puts the configuration into words, one thing a line.
func understood(c *config.Config) []string {
	r := c.Rules
	p := r.Site.Position
	var out []string
	add := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	add("%s", r.Digest)
	add("site %s: latitude %.6g°, longitude %.6g° (east positive), %.6g m above the ellipsoid; %s", r.Site.Name, p.Lat.Degrees(), p.Lon.Degrees(), float64(p.Height), r.Site.TimeZone)
	add("permits: lease %v, read every %v, readers' clocks within %v; decided at least every %v", r.Permit.Lease, r.Permit.Renew, r.Permit.ConsumerClockError, r.Permit.DecisionInterval)
	add("record in %s, facts kept for %.4g days; API at %s, permits at %s", c.DataDir, c.Retention.KeepFacts.Hours()/24, c.Listen, c.PermitListen)
	for i := range r.Beams {
		b := &r.Beams[i]
		add("beam %s: %s; shutters %v before a foreseen closure; opens %v after the last", b.ID, beamWords(b), r.MarginTime(b), b.ReopenAfter)
	}
	for i := range r.Authorities {
		a := &r.Authorities[i]
		add("authority %s: %s; closures from %v before to %v after; %s", a.ID, requiredWord(a.Required), a.Lead, a.Tail, strings.TrimPrefix(waitsFor(a), "it would "))
	}
	for i := range r.Sources {
		s := &r.Sources[i]
		add("source %s: %s, %s, stale after %v", s.ID, s.Kind, requiredWord(s.Required), s.StaleAfter)
	}
	for i := range r.Neighbours {
		n := &r.Neighbours[i]
		silent := "its silence shutters"
		if n.IgnoreSilent {
			silent = "its silence does not shutter"
		}
		add("neighbour %s: %.4g m aperture, field radius %.4g°, %.0f m away; %s", n.ID, float64(n.Aperture), n.Field.Degrees(), n.Offset.Norm(), silent)
	}
	for i := range r.Watches {
		w := &r.Watches[i]
		add("watch %s: %s, at least %d, up to %v", w.Post, requiredWord(w.Required), w.Minimum, w.Shift)
	}
	for i, f := range c.Feeds {
		where := f.Listen + f.Dial + f.File
		add("feed %d: %s at %s speaks for %s", i+1, f.Kind, where, joinNames(f.Sources))
	}
	return out
}

func beamWords(b *closures.BeamRules) string {
	star := "sodium star"
	if b.GuideStar.Rayleigh {
		star = fmt.Sprintf("Rayleigh star from %.6g to %.6g m", float64(b.GuideStar.From), float64(b.GuideStar.Until))
	}
	sun := fmt.Sprintf("Sun below %.4g°", b.Limits.SunBelow.Degrees())
	if b.Limits.SunBelow.Degrees() >= 90 {
		sun = "by day, too"
	}
	launches := "1 launch"
	if n := len(b.Launches); n > 1 {
		launches = fmt.Sprintf("%d launches", n)
	}
	return fmt.Sprintf("%s, %s, %.6g W at %.6g nm; elevation %.4g° to %.4g°, %s", launches, star, b.PowerW, float64(b.Wavelength)*1e9,
		b.Limits.ElevationMin.Degrees(), b.Limits.ElevationMax.Degrees(), sun)
}

func requiredWord(yes bool) string {
	if yes {
		return "required"
	}
	return "optional"
}

// cautions says what the configuration lets pass that a person should know.
func cautions(r *closures.Rules) []string {
	out := []string{}
	add := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	const person = closures.Codes(1<<closures.CodeStarting | 1<<closures.CodeInterlock | 1<<closures.CodeDetectorAlarm | 1<<closures.CodeShutterFault |
		1<<closures.CodeWatchMissing | 1<<closures.CodeClock | 1<<closures.CodeRecord | 1<<closures.CodeFault)
	if loose := r.ByItself & person; loose != 0 {
		add("beams open by themselves after %s: leave them out of rearm.by_itself where a person should look first", strings.Join(loose.Names(), ", "))
	}
	if r.Clock.Synchronised == closures.SyncAssumed {
		add("the kernel's word on its clock is not asked for: the clock must be disciplined by other means")
	}
	required := false
	for i := range r.Authorities {
		required = required || r.Authorities[i].Required
	}
	if !required {
		add("no authority is required: time that no list covers is open")
	}
	hears := false
	for i := range r.Sources {
		s := &r.Sources[i]
		if s.Kind != closures.AircraftSource {
			continue
		}
		hears = hears || s.Required
		if s.MinMessagesPerMin <= 0 && s.ReferenceAddress == "" {
			add("source %s proves reception by nothing: a deaf antenna cannot be told from an empty sky", s.ID)
		}
	}
	if !hears {
		add("no source of aircraft is required: only spotters and detectors see aircraft")
	}
	for i := range r.Beams {
		if b := &r.Beams[i]; !b.FeedbackRequired {
			add("beam %s: its shutter need not say where it is, so one that sticks may go unseen", b.ID)
		}
	}
	return out
}
