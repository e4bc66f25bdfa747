package replay

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
)

// says puts a fact into one sentence. What outsiders wrote is cited as text.
func says(f *closures.Fact) string {
	switch b := f.Body.(type) {
	case closures.RulesSet:
		return fmt.Sprintf("rules %s are put in force%s", b.Rules.Digest, by(b.By))
	case closures.ListOffered:
		c := b.List.Covers()
		return fmt.Sprintf("closure list %s is brought%s: it covers %s to %s, %s, %s", b.List, by(b.By),
			stamp(c.From), stamp(c.Until), count(len(b.List.Text().Regions), "region"), count(len(b.List.Text().Windows), "window"))
	case closures.ListConfirmed:
		return fmt.Sprintf("closure list %s/%s is confirmed%s", b.Authority, b.ID, by(b.By))
	case closures.ListWithdrawn:
		return fmt.Sprintf("closure list %s/%s is to be withdrawn%s%s", b.Authority, b.ID, by(b.By), cited(", confirmed by ", b.ConfirmedBy))
	case closures.NightReady:
		bin := closures.BinOf(b.Night)
		return fmt.Sprintf("the sky from %s to %s is prepared", stamp(bin.From), stamp(bin.Until))
	case closures.AimSeen:
		return aimSays(&b)
	case closures.AircraftSeen:
		return aircraftSays(&b)
	case closures.Sighted:
		return sightedSays(&b)
	case closures.DetectorSeen:
		return fmt.Sprintf("detector %s: %s", b.Source, nameOf([]string{"blind", "alarm", "clear"}, b.State))
	case closures.InterlockSeen:
		return fmt.Sprintf("interlock %s: %s", b.Source, pick(b.Safe, "safe", "not safe"))
	case closures.ShutterSeen:
		return fmt.Sprintf("the shutter of beam %s: %s", b.Beam, nameOf([]string{"not known", "open", "moving", "closed"}, b.Position))
	case closures.LaserSeen:
		s := fmt.Sprintf("the laser of beam %s %s", b.Beam, pick(b.Emitting, "emits", "emits nothing"))
		if geometry.Finite(b.PowerW) {
			s += fmt.Sprintf(", %s W", figure(b.PowerW))
		}
		return s
	case closures.WatchKept:
		return fmt.Sprintf("post %s is kept by %s until %s", b.Post, strings.Join(quotes(b.By), ", "), stamp(b.Until))
	case closures.WeatherSeen:
		return fmt.Sprintf("%s: %s hPa, %s °C", b.Source, figure(b.PressureHPa), figure(b.Temperature))
	case closures.Heard:
		return heardSays(&b)
	}
	return ownSays(f)
}

// ownSays puts people's words and the service's own into one sentence.
func ownSays(f *closures.Fact) string {
	switch b := f.Body.(type) {
	case closures.HoldPlaced:
		s := fmt.Sprintf("hold %s on %s%s: %q, from %s", b.ID, beamsOf(b.Beam), by(b.By), b.Reason, stamp(b.Span().From))
		s += pick(b.Until.IsZero(), " until it is released", " until "+stamp(b.Until))
		return s + pick(b.Region != nil, ", for a part of the sky", "") + pick(b.Authority, ", by an authority's order", "")
	case closures.HoldReleased:
		return fmt.Sprintf("hold %s is released%s%s", b.ID, by(b.By), cited(", reference ", b.Reference))
	case closures.Rearmed:
		return fmt.Sprintf("%s re-armed%s%s", beamsOf(b.Beam)+pick(b.Beam == closures.EveryBeam, " are", " is"), by(b.By), cited(": ", b.Note))
	case closures.TrackReleased:
		return fmt.Sprintf("the lost track of aircraft %q is released%s, on the word of %q", b.Aircraft, by(b.By), b.Spotter)
	case closures.ClockState:
		return clockSays(&b)
	case closures.RecordState:
		return recordSays(&b)
	case closures.Started:
		return "what must outlive a restart is restored, and facts may come"
	case closures.Veto:
		return fmt.Sprintf("the second opinion vetoes %s: %s", beamsOf(b.Beam), b.Detail)
	case closures.Fault:
		return fmt.Sprintf("a fault of the service on %s: %s", beamsOf(b.Beam), b.Detail)
	case closures.Tick:
		return "the batch ends"
	}
	return "a fact of no known kind"
}

func aimSays(b *closures.AimSeen) string {
	who := "beam " + string(b.Beam)
	if b.Telescope != "" {
		who = "telescope " + string(b.Telescope)
	}
	a := b.Aim
	if a == nil {
		return who + ": an aim that cannot be read"
	}
	s := who + " points at "
	switch a.Frame {
	case closures.ICRS, closures.OfDate:
		ra, dec := geometry.ToEquator(a.Direction)
		s += fmt.Sprintf("RA %s, Dec %s (%s)", degrees(ra), degrees(dec), pick(a.Frame == closures.ICRS, "ICRS", "of date"))
	case closures.Horizon:
		az, el := geometry.ToHorizon(a.Direction)
		s += fmt.Sprintf("azimuth %s, elevation %s%s", degrees(az), degrees(el), pick(a.Refracted, ", as seen through the air", ""))
	case closures.Table:
		s += fmt.Sprintf("a table of %d points", len(a.Points))
	default:
		s += "nowhere"
	}
	s += fmt.Sprintf(", error %s arcsec, %s", figure(float64(a.Error/geometry.Arcsecond)), nameOf(motionNames[:], a.Motion))
	return s + cited(", by ", b.From) + cited(", target ", b.Target) + ", said " + stamp(b.Said)
}

func aircraftSays(b *closures.AircraftSeen) string {
	s := fmt.Sprintf("aircraft %q by %s", b.Aircraft, b.Source)
	if !b.Located {
		s += ", without a position"
	} else {
		s += fmt.Sprintf(" at latitude %s, longitude %s", degrees(b.Position.Lat), degrees(b.Position.Lon))
		s += pick(b.AltitudeFrom == closures.NoAltitude, ", without an altitude",
			fmt.Sprintf(", %s m %s", figure(float64(b.Position.Height)), nameOf([]string{"", "above the ellipsoid", "above mean sea level", "by pressure"}, b.AltitudeFrom)))
	}
	if geometry.Finite(float64(b.Speed), float64(b.Track)) {
		s += fmt.Sprintf(", %s m/s towards %s", figure(float64(b.Speed)), degrees(b.Track))
	}
	return s + pick(b.OnGround, ", on the ground", "") + pick(b.Drill, ", a drill", "") + ", said " + stamp(b.Said)
}

func sightedSays(b *closures.Sighted) string {
	switch {
	case b.Clear:
		return fmt.Sprintf("spotter %s: clear", b.Source)
	case !b.HasDirection:
		return fmt.Sprintf("spotter %s saw something, in no stated direction", b.Source)
	}
	az, el := geometry.ToHorizon(b.Direction)
	return fmt.Sprintf("spotter %s saw something at azimuth %s, elevation %s, within %s", b.Source, degrees(az), degrees(el), degrees(b.Spread))
}

func heardSays(b *closures.Heard) string {
	s := fmt.Sprintf("source %s is heard (%s)", b.Source, nameOf([]string{"its link lives", "it receives"}, b.Scope))
	if geometry.Finite(b.MessagesPerMinute) {
		s += fmt.Sprintf(", %s messages a minute", figure(b.MessagesPerMinute))
	}
	return s + pick(b.Connected, ", over a connection made just now", "")
}

func clockSays(b *closures.ClockState) string {
	s := "the clock: " + pick(b.Synchronised, "synchronised", "not synchronised")
	s += pick(b.MaxError < 0, ", its error is not known", ", off by at most "+b.MaxError.String())
	return s + pick(b.Step != 0, ", it stepped by "+b.Step.String(), "") + pick(b.Suspended, ", the machine slept", "")
}

func recordSays(b *closures.RecordState) string {
	s := fmt.Sprintf("the record: on disk up to entry %d, %s behind", b.Durable, b.Behind)
	return s + pick(b.Half, ", its queue over half full", "") + pick(b.Full, ", it refused an entry", "") +
		pick(b.Failed, ", it cannot be written", "") + pick(b.Damaged, ", it is damaged", "")
}

func beamsOf(id closures.BeamID) string {
	if id == closures.EveryBeam {
		return "all beams"
	}
	return "beam " + string(id)
}

func by(name string) string { return cited(" by ", name) }

// cited quotes what a person or a sender wrote; nothing where that is empty.
func cited(before, text string) string {
	if text == "" {
		return ""
	}
	if closures.ValidName(text) {
		return before + text
	}
	return before + strconv.Quote(text)
}

func quotes(list []string) []string {
	out := make([]string, len(list))
	for i, s := range list {
		out[i] = cited("", s)
	}
	return out
}

func pick(yes bool, a, b string) string {
	if yes {
		return a
	}
	return b
}

// stamp writes an instant to the millisecond, cut.
func stamp(t time.Time) string { return wire.FormatTime(t.UTC().Truncate(time.Millisecond)) }

// degrees writes an angle to a tenth of a milliarcsecond, which is what tells
// two fields apart.
func degrees(a s1.Angle) string { return strconv.FormatFloat(a.Degrees(), 'f', 4, 64) + "°" }

// figure writes a number with the digits that matter to a reader.
func figure(v float64) string {
	if math.Abs(v) >= 1000 {
		return strconv.FormatFloat(math.Round(v), 'f', -1, 64)
	}
	return strconv.FormatFloat(v, 'g', 4, 64)
}
