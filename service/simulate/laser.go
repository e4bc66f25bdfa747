package simulate

import (
	"errors"
	"fmt"
	"math"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/permit"
)

// laser is the control of one beam: it reads the permit, opens its shutter at
// once when it may, and closes it as late as the site's bounds allow. Were it
// real it would refuse a simulated permit; this shutter is made of words.
type laser struct {
	beam    closures.BeamID
	shutter time.Duration // how long it takes
	behind  time.Duration // how far its clock is behind; negative: ahead
	deaf    bool          // broken on purpose: it ignores valid_until

	lit        bool
	validUntil time.Time // of the permit that it goes by
	closing    time.Time // when it began to close; zero: it does not
	reads      int
}

// endsAt is when the light goes, by what the control knows so far.
func (l *laser) endsAt() time.Time {
	end := l.validUntil.Add(l.behind + l.shutter)
	if l.deaf {
		end = closures.Forever
	}
	if !l.closing.IsZero() && l.closing.Add(l.shutter).Before(end) {
		end = l.closing.Add(l.shutter)
	}
	return end
}

// read asks for the permit, proves it and acts on it.
func (l *laser) read(i *permit.Issuer, at time.Time) (open bool, err error) {
	nonce := fmt.Sprintf("%s-%d", l.beam, l.reads)
	l.reads++
	answer, err := i.Permit(l.beam, nonce)
	if err != nil {
		return false, err
	}
	p, err := wire.VerifyPermit(answer.Signed, i.Key().Public())
	switch {
	case err != nil:
		return false, err
	case p.Beam != l.beam || p.Nonce != nonce || !p.Simulated || p.Allows(at):
		return false, errors.New("reading a permit: it answers another request, or does not say that it is simulated")
	}
	// By its own clock, and by the lease from the sending of the request.
	own := at.Add(-l.behind)
	open = p.State == wire.Open
	if open && own.Before(p.ValidUntil) {
		l.lit, l.validUntil, l.closing = true, p.ValidUntil, time.Time{}
		return open, nil
	}
	if l.lit && l.closing.IsZero() {
		l.closing = at
	}
	return open, nil
}

// says is what the control tells of its shutter and its light.
func (l *laser) says(at time.Time) []closures.Body {
	position := closures.ShutterClosed
	if l.lit {
		position = closures.ShutterOpen
		if !l.closing.IsZero() {
			position = closures.ShutterMoving
		}
	}
	power := math.NaN() // no power is said of no light
	if l.lit {
		power = 20
	}
	return []closures.Body{closures.ShutterSeen{Beam: l.beam, Said: at, Position: position}, closures.LaserSeen{Beam: l.beam, Said: at, Emitting: l.lit, PowerW: power}}
}
