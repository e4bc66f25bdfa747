package wire

import (
	"fmt"
	"time"

	"beamward/closures"
	"beamward/geometry/sky"
)

// The kinds of the record's entries that hold what this package writes.
const (
	KindRules         = "rules"
	KindListOffered   = "list-offered"
	KindListConfirmed = "list-confirmed"
	KindListWithdrawn = "list-withdrawn"
	KindNight         = "night"
	KindAim           = "aim"
	KindAircraft      = "aircraft"
	KindSighting      = "sighting"
	KindDetector      = "detector"
	KindInterlock     = "interlock"
	KindShutter       = "shutter"
	KindLaser         = "laser"
	KindWatch         = "watch"
	KindWeather       = "weather"
	KindHeard         = "heard"
	KindHold          = "hold"
	KindHoldReleased  = "hold-released"
	KindRearmed       = "rearmed"
	KindTrackReleased = "track-released"
	KindClock         = "clock"
	KindRecord        = "record"
	KindStarted       = "started"
	KindVeto          = "veto"
	KindFault         = "fault"
	KindTick          = "tick"

	KindDecision = "decision"
	KindDurable  = "durable"
)

// Resolver finds what the record names rather than holds.
type Resolver struct {
	Rules func(closures.Digest) (*closures.Rules, error) // from their canonical text
	List  func(closures.Digest) (*closures.List, error)
	Night func(bin time.Time) (*sky.Night, error) // by the start of its bin, under the rules then in force
}

// EncodeBody appends the record's form of a fact's sender and body; the number
// and the instant are the entry's own. Rules and lists are named by their
// digest and a night by its bin, everything else is held to the last bit. It
// fails, and returns no body, for what could not be read back the same: rules
// or a list without a digest, text that is not UTF-8, a value without a word.
func EncodeBody(dst []byte, f closures.Fact) (kind string, body []byte, err error) {
	a := archive{out: dst}
	a.mark('{')
	text(&a, "via", &f.From)
	switch b := f.Body.(type) {
	case closures.RulesSet:
		kind = KindRules
		rulesSet(&a, &b, nil)
	case closures.ListOffered:
		kind = KindListOffered
		listOffered(&a, &b, nil)
	case closures.ListConfirmed:
		kind = KindListConfirmed
		listConfirmed(&a, &b)
	case closures.ListWithdrawn:
		kind = KindListWithdrawn
		listWithdrawn(&a, &b)
	case closures.NightReady:
		kind = KindNight
		nightReady(&a, &b, nil)
	case closures.AimSeen:
		kind = KindAim
		aimSeen(&a, &b)
	case closures.AircraftSeen:
		kind = KindAircraft
		aircraftSeen(&a, &b)
	case closures.Sighted:
		kind = KindSighting
		sighted(&a, &b)
	case closures.DetectorSeen:
		kind = KindDetector
		detectorSeen(&a, &b)
	case closures.InterlockSeen:
		kind = KindInterlock
		interlockSeen(&a, &b)
	case closures.ShutterSeen:
		kind = KindShutter
		shutterSeen(&a, &b)
	case closures.LaserSeen:
		kind = KindLaser
		laserSeen(&a, &b)
	case closures.WatchKept:
		kind = KindWatch
		watchKept(&a, &b)
	case closures.WeatherSeen:
		kind = KindWeather
		weatherSeen(&a, &b)
	case closures.Heard:
		kind = KindHeard
		heard(&a, &b)
	case closures.HoldPlaced:
		kind = KindHold
		holdPlaced(&a, &b)
	case closures.HoldReleased:
		kind = KindHoldReleased
		holdReleased(&a, &b)
	case closures.Rearmed:
		kind = KindRearmed
		rearmed(&a, &b)
	case closures.TrackReleased:
		kind = KindTrackReleased
		trackReleased(&a, &b)
	case closures.ClockState:
		kind = KindClock
		clockState(&a, &b)
	case closures.RecordState:
		kind = KindRecord
		recordState(&a, &b)
	case closures.Started:
		kind = KindStarted
	case closures.Veto:
		kind = KindVeto
		veto(&a, &b)
	case closures.Fault:
		kind = KindFault
		fault(&a, &b)
	case closures.Tick:
		kind = KindTick
	default:
		a.fail(fmt.Sprintf("no form for a %T", f.Body))
	}
	a.mark('}')
	if a.err != nil {
		return "", nil, fmt.Errorf("writing a fact for the record: %w", a.err)
	}
	return kind, a.out, nil
}

// DecodeBody reads what EncodeBody wrote: the fact without its number and its
// instant. What the record names is asked of r and held against its name.
func DecodeBody(kind string, body []byte, r Resolver) (closures.Fact, error) {
	a := reader(body)
	var f closures.Fact
	a.mark('{')
	if a.err == nil {
		text(&a, "via", &f.From)
		f.Body = a.body(kind, &r)
	}
	a.mark('}')
	if err := a.end(); err != nil {
		return closures.Fact{}, fmt.Errorf("reading an entry of the record, kind %s: %w", quote([]byte(kind)), err)
	}
	return f, nil
}

func (a *archive) body(kind string, r *Resolver) closures.Body {
	switch kind {
	case KindRules:
		return bodyOf(a, func(a *archive, b *closures.RulesSet) { rulesSet(a, b, r) })
	case KindListOffered:
		return bodyOf(a, func(a *archive, b *closures.ListOffered) { listOffered(a, b, r) })
	case KindListConfirmed:
		return bodyOf(a, listConfirmed)
	case KindListWithdrawn:
		return bodyOf(a, listWithdrawn)
	case KindNight:
		return bodyOf(a, func(a *archive, b *closures.NightReady) { nightReady(a, b, r) })
	case KindAim:
		return bodyOf(a, aimSeen)
	case KindAircraft:
		return bodyOf(a, aircraftSeen)
	case KindSighting:
		return bodyOf(a, sighted)
	case KindDetector:
		return bodyOf(a, detectorSeen)
	case KindInterlock:
		return bodyOf(a, interlockSeen)
	case KindShutter:
		return bodyOf(a, shutterSeen)
	case KindLaser:
		return bodyOf(a, laserSeen)
	case KindWatch:
		return bodyOf(a, watchKept)
	case KindWeather:
		return bodyOf(a, weatherSeen)
	case KindHeard:
		return bodyOf(a, heard)
	case KindHold:
		return bodyOf(a, holdPlaced)
	case KindHoldReleased:
		return bodyOf(a, holdReleased)
	case KindRearmed:
		return bodyOf(a, rearmed)
	case KindTrackReleased:
		return bodyOf(a, trackReleased)
	case KindClock:
		return bodyOf(a, clockState)
	case KindRecord:
		return bodyOf(a, recordState)
	case KindStarted:
		return closures.Started{}
	case KindVeto:
		return bodyOf(a, veto)
	case KindFault:
		return bodyOf(a, fault)
	case KindTick:
		return closures.Tick{}
	}
	a.fail("no fact has this kind")
	return nil
}

func bodyOf[T closures.Body](a *archive, fields func(*archive, *T)) closures.Body {
	var b T
	fields(a, &b)
	return b
}
