package wire

import (
	"errors"
	"fmt"
	"math"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
)

// AppendFact appends the line, without a line end, that ParseFact reads back as
// body: the same but for rounding in the last digits, where angles go to
// degrees and back. What outsiders cannot say, such as a hold or a connection
// made, and what ParseFact would refuse for its range or its name is an error;
// dst is then returned as it was.
func AppendFact(dst []byte, body closures.Body) ([]byte, error) {
	w := writer{out: dst}
	k := w.body(body)
	if k == noKind {
		return dst, fmt.Errorf("writing a fact: a %T is not said by outsiders", body)
	}
	w.out = append(w.out, '}')
	if w.wrong != nil {
		return dst, w.wrong
	}
	// One reader says what is well formed. The instant is not its business here.
	var p Parser
	_, _, err := p.Fact(w.out[len(dst):], w.said)
	if err != nil {
		return dst, fmt.Errorf("writing a fact: %w", err)
	}
	return w.out, nil
}

type writer struct {
	out   []byte
	said  time.Time
	wrong error
}

func (w *writer) body(body closures.Body) kind {
	switch b := body.(type) {
	case closures.AimSeen:
		return w.aim(&b)
	case closures.AircraftSeen:
		return w.aircraft(&b)
	case closures.Sighted:
		w.begin(kSighting, b.Said)
		w.text(fSource, string(b.Source))
		if b.HasDirection {
			az, el := geometry.ToHorizon(b.Direction)
			w.degrees(fAz, az)
			w.degrees(fEl, el)
			w.degrees(fSpread, b.Spread)
		}
		if b.For != 0 {
			w.number(fFor, b.For.Seconds())
		}
		w.yes(fClear, b.Clear)
		return kSighting
	case closures.DetectorSeen:
		w.begin(kDetector, b.Said)
		w.text(fSource, string(b.Source))
		w.word(fState, uint8(b.State))
		return kDetector
	case closures.InterlockSeen:
		w.begin(kInterlock, b.Said)
		w.text(fSource, string(b.Source))
		w.boolean(fSafe, b.Safe)
		return kInterlock
	case closures.ShutterSeen:
		w.begin(kShutter, b.Said)
		w.text(fBeam, string(b.Beam))
		w.word(fPosition, uint8(b.Position))
		return kShutter
	case closures.LaserSeen:
		w.begin(kLaser, b.Said)
		w.text(fBeam, string(b.Beam))
		w.boolean(fEmitting, b.Emitting)
		w.known(fPower, b.PowerW)
		return kLaser
	case closures.WatchKept:
		w.begin(kWatch, b.Said)
		w.text(fPost, b.Post)
		w.key(fBy)
		w.out = append(w.out, '[')
		for i, name := range b.By {
			if i > 0 {
				w.out = append(w.out, ',')
			}
			w.out = appendString(w.out, name)
		}
		w.out = append(w.out, ']')
		w.instant(fUntil, b.Until)
		return kWatch
	case closures.WeatherSeen:
		w.begin(kWeather, b.Said)
		w.text(fSource, string(b.Source))
		w.number(fPressure, b.PressureHPa)
		w.number(fTemperature, b.Temperature)
		return kWeather
	case closures.Heard:
		w.begin(kHeard, b.Said)
		w.text(fSource, string(b.Source))
		w.word(fScope, uint8(b.Scope))
		w.known(fMessages, b.MessagesPerMinute)
		if b.Connected {
			w.wrong = errors.New("writing a fact: only who made a connection can say so")
		}
		return kHeard
	}
	return noKind
}

func (w *writer) aim(b *closures.AimSeen) kind {
	w.begin(kAim, b.Said)
	w.some(fBeam, string(b.Beam))
	w.some(fTelescope, string(b.Telescope))
	a := b.Aim
	if a == nil {
		w.wrong = errors.New("writing a fact: the aim is missing")
		return kAim
	}
	switch a.Frame {
	case closures.ICRS:
		w.equator(fICRS, a)
	case closures.OfDate:
		w.equator(fOfDate, a)
	case closures.Horizon:
		az, el := geometry.ToHorizon(a.Direction)
		w.pair(fHorizon, fAz, az.Degrees(), fEl, el.Degrees())
		w.boolean(fRefracted, a.Refracted)
	case closures.Table:
		w.key(fTable)
		for i, p := range a.Points {
			w.out = append(w.out, "[,"[min(i, 1)])
			w.out = append(w.out, '{')
			w.instant(fAt, p.At)
			ra, dec := geometry.ToEquator(p.Direction)
			w.number(fRA, ra.Degrees())
			w.number(fDec, dec.Degrees())
			w.out = append(w.out, '}')
		}
		w.out = append(w.out, ']')
	}
	const arcsec = float64(geometry.Arcsecond)
	if a.RateRA != 0 || a.RateDec != 0 {
		if !a.Reference.Equal(b.Said) {
			w.wrong = errors.New("writing a fact: the aim's rates hold from another instant than the fact's")
		}
		first, second := fRateRA, fRateDec
		if a.Frame == closures.Horizon {
			first, second = fRateAz, fRateEl
		}
		w.pair(fRate, first, a.RateRA/arcsec, second, a.RateDec/arcsec)
	}
	if a.PMRA != 0 || a.PMDec != 0 {
		w.pair(fPM, fPMRA, a.PMRA/arcsec*1e3, fPMDec, a.PMDec/arcsec*1e3)
	}
	if a.Error != 0 {
		w.number(fErrorArcsec, float64(a.Error/geometry.Arcsecond))
	}
	w.some(fFrom, b.From)
	w.some(fTarget, b.Target)
	if a.Motion != closures.MotionNotSaid {
		w.word(fMotion, uint8(a.Motion))
	}
	if b.Field != 0 {
		w.degrees(fFieldRadius, b.Field)
	}
	if b.Exposing != closures.NotSaid {
		w.boolean(fExposing, b.Exposing == closures.Yes)
	}
	return kAim
}

func (w *writer) aircraft(b *closures.AircraftSeen) kind {
	w.begin(kAircraft, b.Said)
	w.text(fSource, string(b.Source))
	w.text(fAircraft, b.Aircraft)
	if b.Located {
		w.degrees(fLat, b.Position.Lat)
		lon := b.Position.Lon.Degrees()
		if lon < -180 {
			lon += 360
		}
		w.number(fLon, lon)
	}
	if b.AltitudeFrom != closures.NoAltitude {
		w.number(fAltitude, float64(b.Position.Height))
		w.word(fAltitudeFrom, uint8(b.AltitudeFrom))
	}
	w.known(fSpeed, float64(b.Speed))
	w.known(fTrack, b.Track.Degrees())
	w.known(fClimb, float64(b.Climb))
	w.known(fError, float64(b.Error))
	w.known(fVerticalError, float64(b.VerticalError))
	w.known(fVelocityError, float64(b.VelocityError))
	w.known(fVerticalVelocityError, float64(b.VerticalVelError))
	w.yes(fOnGround, b.OnGround)
	w.yes(fDrill, b.Drill)
	return kAircraft
}

func (w *writer) begin(k kind, said time.Time) {
	w.said = said
	w.out = append(w.out, '{')
	w.word(fKind, uint8(k))
	w.instant(fAt, said)
}

func (w *writer) key(f field) {
	if w.out[len(w.out)-1] != '{' {
		w.out = append(w.out, ',')
	}
	w.out = append(append(append(w.out, '"'), fieldNames[f]...), `":`...)
}

func (w *writer) text(f field, s string) {
	w.key(f)
	w.out = appendString(w.out, s)
}

// some writes a text that may be missing.
func (w *writer) some(f field, s string) {
	if s != "" {
		w.text(f, s)
	}
}

func (w *writer) word(f field, i uint8) {
	list := words[f-numTexts]
	w.text(f, list[min(int(i), len(list)-1)])
	if int(i) >= len(list) {
		w.wrong = fmt.Errorf("writing a fact: %s has no word %d", fieldNames[f], i)
	}
}

func (w *writer) instant(f field, t time.Time) {
	w.key(f)
	w.out = append(AppendTime(append(w.out, '"'), t), '"')
}

func (w *writer) boolean(f field, v bool) {
	w.key(f)
	if v {
		w.out = append(w.out, "true"...)
	} else {
		w.out = append(w.out, "false"...)
	}
}

// yes writes a boolean that is false when it is missing.
func (w *writer) yes(f field, v bool) {
	if v {
		w.boolean(f, v)
	}
}

func (w *writer) number(f field, v float64) {
	w.key(f)
	w.out = appendNumber(w.out, settle(f, v))
}

// settle takes back what a turn of units may put in the last digit past the
// end of a range.
func settle(f field, v float64) float64 {
	l := &limits[f-endBools]
	for _, end := range [...]float64{l.low, l.high} {
		if math.Abs(v-end) <= 1e-12*math.Abs(end) {
			return end
		}
	}
	return v
}

// known writes a number that is missing when it is NaN.
func (w *writer) known(f field, v float64) {
	if !math.IsNaN(v) {
		w.number(f, v)
	}
}

func (w *writer) degrees(f field, a s1.Angle) { w.number(f, a.Degrees()) }

func (w *writer) equator(f field, a *closures.Aim) {
	ra, dec := geometry.ToEquator(a.Direction)
	w.pair(f, fRA, ra.Degrees(), fDec, dec.Degrees())
}

// pair writes an object of two numbers.
func (w *writer) pair(f, first field, a float64, second field, b float64) {
	w.key(f)
	w.out = append(w.out, '{')
	w.number(first, a)
	w.number(second, b)
	w.out = append(w.out, '}')
}
