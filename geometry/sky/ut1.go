package sky

import (
	"fmt"
	"math"
	"time"

	"beamward/geometry"

	"github.com/golang/geo/s1"
)

// MaxUT1Offset bounds |UT1-UTC| while leap seconds are kept as they are
// (ITU-R TF.460-6). The CGPM means to give that up by 2035 (resolution 4 of
// 2022); from then on a site must state UT1-UTC.
const MaxUT1Offset = 900 * time.Millisecond

// knownWithin is how far a stated UT1-UTC may be off until its end: the figure
// broadcast with time signals has steps of 0.1 s.
const knownWithin = 50 * time.Millisecond

// UT1 is what the site was told about the turning of the Earth. The zero value
// is unknown.
type UT1 struct {
	Offset time.Duration // UT1-UTC, right within 0.05 s until Until
	Until  time.Time     // first instant at which Offset is no longer to be used
	Known  bool
}

// over returns the offset to apply to a night that ends at end, and the bound
// of its error. A night that reaches past Until counts as unknown: no offset
// is applied and the whole bound of 0.9 s is error.
func (u UT1) over(end time.Time) (offset, within time.Duration) {
	if u.Known && !end.After(u.Until) {
		return u.Offset, knownWithin
	}
	return 0, MaxUT1Offset
}

func (u UT1) validate() error {
	if u.Known && (u.Offset > MaxUT1Offset || u.Offset < -MaxUT1Offset) {
		return fmt.Errorf("UT1-UTC of %v: |UT1-UTC| is at most %v; state it in seconds from the newest IERS Bulletin A or D", u.Offset, MaxUT1Offset)
	}
	return nil
}

// angleOf is how far the sky turns in d.
func angleOf(d time.Duration) s1.Angle {
	return s1.Angle(d.Seconds() * siderealRate)
}

const (
	// siderealRate is the turning of the Earth against the equinox in rad a
	// second of UT1 (Meeus ch. 12).
	siderealRate = 1.00273790935 * 2 * math.Pi / 86400

	arcsec = float64(geometry.Arcsecond)
)
