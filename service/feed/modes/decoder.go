package modes

import (
	"errors"
	"fmt"
	"strings"
	"time"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/encounter"
)

// Options are what a Decoder is made of.
type Options struct {
	Source closures.Source
	Site   earth.Position  // of the receiver
	Geoid  geometry.Length // its height above the ellipsoid there
	Motion encounter.Motion

	// Hard bounds of the errors where an aircraft states none.
	PositionError geometry.Length
	VelocityError geometry.Speed
	ClimbError    geometry.Speed

	Most  int             // aircraft remembered: 4096
	Range geometry.Length // beyond it nothing is received: 900 km
}

// Decoder makes reports of frames. It has one owner.
type Decoder struct {
	options Options
	site    place
	fastest float64 // m/s
	reach   float64 // m
	store   store
	counts  Counts
	last    int64 // the newest instant fed, Unix nanoseconds
}

// NewDecoder makes a decoder that remembers nothing yet.
func NewDecoder(o Options) (*Decoder, error) {
	m := o.Motion
	switch {
	case !closures.ValidName(string(o.Source)):
		return nil, fmt.Errorf("making a Mode S decoder: %.80q is not a source's name", o.Source)
	case !o.Site.Valid():
		return nil, errors.New("making a Mode S decoder: the site's position is not valid")
	case !(o.PositionError > 0 && o.VelocityError > 0 && o.ClimbError > 0) || !(m.Speed > 0 && m.Climb > 0 && m.HorizontalAcceleration > 0 && m.VerticalAcceleration > 0) ||
		!geometry.Finite(float64(o.PositionError), float64(o.VelocityError), float64(o.ClimbError), float64(o.Geoid), float64(o.Range),
			float64(m.Speed), float64(m.Climb), float64(m.HorizontalAcceleration), float64(m.VerticalAcceleration)):
		return nil, errors.New("making a Mode S decoder: a bound is missing: state all errors and all bounds on motion")
	}
	if o.Most <= 0 {
		o.Most = 4096
	}
	if o.Range <= 0 {
		o.Range = 900e3
	}
	return &Decoder{options: o, site: placeAt(o.Site.Lat.Degrees(), o.Site.Lon.Degrees()), fastest: float64(m.Speed), reach: float64(o.Range),
		store: newStore(o.Most)}, nil
}

// Counts returns what became of the frames so far.
func (d *Decoder) Counts() Counts {
	c := d.counts
	c.Aircraft, c.Evicted = len(d.store.list), d.store.evicted
	return c
}

// Callsigns returns the identifications heard, trimmed, by the names of the
// reports' aircraft.
func (d *Decoder) Callsigns() map[string]string {
	out := map[string]string{}
	for i := range d.store.list {
		if a := &d.store.list[i]; a.sign != "" {
			out[a.name] = strings.TrimSpace(a.sign)
		}
	}
	return out
}

// Forget drops all memory but the counts.
func (d *Decoder) Forget() {
	d.store.forget()
	d.last = 0
}

// The instants that are taken, 1990 to 2200, in Unix nanoseconds.
const (
	firstInstant = 631152000 * second
	lastInstant  = 7258118400 * second
)

// clockSlack is how far the clock may go back before all is forgotten: frames
// of several receivers are a little out of order.
const clockSlack = second

// Decode takes in one frame, received at the instant given, and returns the
// report that it completes, if any. Frames are fed in the order in which they
// were received.
func (d *Decoder) Decode(f *Frame, received time.Time) (seen closures.AircraftSeen, ok bool) {
	d.counts.Frames++
	if s := received.Unix(); !(s >= firstInstant/second && s < lastInstant/second) {
		d.counts.BadTime++
		return seen, false
	}
	at := received.UnixNano()
	switch {
	case at < d.last-clockSlack:
		d.counts.ClockBack++
		d.Forget()
		d.last = at
	case at > d.last:
		d.last = at
	}
	a := d.sender(f, at)
	if a == nil {
		return seen, false
	}
	d.counts.Proven++
	a.frames++
	a.heard = at
	if df := f.Format(); df == 17 || df == 18 {
		if seen, ok = d.squitter(a, f.me(), at); ok {
			return d.finish(a, seen, received)
		}
	}
	if !d.needsNaming(a, at) {
		return closures.AircraftSeen{}, false
	}
	a.nameless = at
	d.counts.Unlocated++
	seen = closures.AircraftSeen{Source: d.options.Source, Said: received.UTC(), Aircraft: a.name}
	seen.OnGround = a.newest().me != 0 && a.newest().cpr.Surface
	return unplaced(seen), true
}

// How long a report with a position stands for the aircraft, after which its
// other frames make reports without one, and how often they do.
const (
	placedFor     = 10 * second
	namelessEvery = second
)

// needsNaming reports whether an aircraft must be reported although where it
// is is not known. One frame proves no aircraft.
func (d *Decoder) needsNaming(a *aircraft, at int64) bool {
	return a.frames >= 2 && (a.located == 0 || at-a.located > placedFor) && (a.nameless == 0 || at-a.nameless >= namelessEvery)
}

// sender finds who sent a frame, or nobody where its parity proves no one.
func (d *Decoder) sender(f *Frame, at int64) *aircraft {
	df := f.Format()
	long := df >= 16
	if long != f.Long() || f.n == 0 {
		d.counts.Unproven++
		return nil
	}
	rest := f.Remainder()
	switch df {
	case 17:
		if rest == 0 {
			return d.store.hear(keyOf(own, f.Address()))
		}
		d.counts.BadParity++
		return nil
	case 18:
		if rest != 0 {
			d.counts.BadParity++
			return nil
		}
		return d.ground(f)
	case 11:
		// Sent unasked the remainder is 0; asked for, the asker's code of seven
		// bits, which proves an address only that is known.
		if rest == 0 {
			return d.store.hear(keyOf(own, f.Address()))
		}
		if rest < 80 {
			return d.heardBefore(keyOf(own, f.Address()), at)
		}
	case 0, 4, 5, 16, 20, 21:
		return d.heardBefore(keyOf(own, rest), at)
	}
	d.counts.Unproven++
	return nil
}

// knownFor is how long an address that was proven proves frames that carry it
// in their parity.
const knownFor = 60 * second

func (d *Decoder) heardBefore(k key, at int64) *aircraft {
	if a := d.store.find(k); a != nil && a.frames >= 2 && at-a.heard <= knownFor {
		return d.store.hear(k)
	}
	d.counts.Unproven++
	return nil
}

// ground tells the uses of DF 18 apart by its control field.
func (d *Decoder) ground(f *Frame) *aircraft {
	imf := f.me().bit(8)
	if tc := f.me().typeCode(); tc == 19 {
		imf = f.me().bit(9)
	}
	k := own
	switch f.b[0] & 7 {
	case 0:
	case 1:
		k = anonymous
	case 2:
		k = tisb
		if imf {
			k = tisbOther
		}
	case 5:
		k = tisbOther
	case 6:
		k = adsr
		if imf {
			k = adsrOther
		}
	default: // coarse TIS-B, management, reserved: no aircraft's position
		d.counts.Unused++
		return nil
	}
	if k >= tisb {
		d.counts.Rebroadcast++
	}
	return d.store.hear(keyOf(k, f.Address()))
}

func (a *aircraft) kind() kind { return kind(a.key >> 24) }

// squitter takes in the message of an extended squitter.
func (d *Decoder) squitter(a *aircraft, m message, at int64) (seen closures.AircraftSeen, ok bool) {
	switch tc := m.typeCode(); {
	case tc >= 5 && tc <= 8:
		return d.position(a, m, CPR{Lat: m.bits(23, 17), Lon: m.bits(40, 17), Odd: m.bit(22), Surface: true}, at)
	case tc >= 9 && tc <= 18, tc >= 20 && tc <= 22:
		return d.position(a, m, CPR{Lat: m.bits(23, 17), Lon: m.bits(40, 17), Odd: m.bit(22)}, at)
	case tc == 19:
		d.motion(a, m, at)
	case tc >= 1 && tc <= 4:
		if sign, valid := m.identification(); !valid {
			d.counts.BadMessage++
		} else if sign != a.sign {
			a.sign = sign
		}
	case tc == 29 && a.kind() < tisb:
		if t, defined := m.target(); !defined {
			d.counts.BadMessage++
		} else if a.stated != 0 && a.status.Version == 2 {
			a.status.NACp, a.status.SIL = t.NACp, t.SIL
		}
	case tc == 31 && a.kind() < tisb:
		if s, defined := m.status(); defined {
			a.status, a.stated = s, at
		} else {
			d.counts.BadMessage++
		}
	default:
		d.counts.Unused++
	}
	return seen, false
}

// suspicion is how long after a contradiction an address may be two
// aircraft's.
const suspicion = 10 * second

// motion takes in a velocity. One that no aircraft could have changed to since
// the last comes from another aircraft of the same address, or is wrong.
func (d *Decoder) motion(a *aircraft, m message, at int64) {
	v, ok := m.velocity()
	if !ok {
		d.counts.BadMessage++
		return
	}
	if a.kind() >= tisb {
		v.NACv, v.AboveFt = 0, nan // these bits mean something else there
	}
	if a.moved != 0 && d.erratic(&a.velocity, &v, seconds(at-a.moved)) {
		d.counts.Erratic++
		a.suspect = max(a.suspect, at+suspicion)
	}
	a.velocity, a.moved = v, at
}

// erratic reports whether a change of velocity within dt is more than motion
// and errors allow. What is not stated contradicts nothing.
func (d *Decoder) erratic(was, is *Velocity, dt float64) bool {
	slack := 2*float64(d.options.VelocityError) + 2*(was.step()+is.step())*knot
	dv := knot * hypot(is.EastKt-was.EastKt, is.NorthKt-was.NorthKt)
	return dv > slack+float64(d.options.Motion.HorizontalAcceleration)*(dt+1)
}

func seconds(ns int64) float64 {
	if ns < 0 {
		ns = -ns
	}
	return float64(ns) * 1e-9
}
