package plan

import (
	"fmt"
	"math"
	"strings"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
)

// column is one thing that a table says of a target. The numbers come first.
type column uint8

const (
	cRA column = iota
	cDec
	cPMRA
	cPMDec
	cRateRA
	cRateDec
	cAz
	cEl
	cLength
	cPriority
	cMinSpan
	cReacquire
	numNumbers
)

const (
	cRateAt column = numNumbers + iota
	cPointAt
	cRefracted
	cName
	numColumns
)

// columnNames are how CSV and JSON write them.
var columnNames = [numColumns]string{
	cName: "name", cRA: "ra_deg", cDec: "dec_deg", cPMRA: "pm_ra_mas_yr", cPMDec: "pm_dec_mas_yr",
	cRateRA: "rate_ra_arcsec_s", cRateDec: "rate_dec_arcsec_s", cRateAt: "rate_at", cAz: "az_deg", cEl: "el_deg", cRefracted: "refracted",
	cPointAt: "point_at", cLength: "length_s", cPriority: "priority", cMinSpan: "min_span_s", cReacquire: "reacquire_s",
}

// bounds of the numbers.
var bounds = [numNumbers][2]float64{
	cRA: {0, 360}, cDec: {-90, 90}, cPMRA: {-20000, 20000}, cPMDec: {-20000, 20000}, cRateRA: {-36000, 36000}, cRateDec: {-36000, 36000},
	cAz: {0, 360}, cEl: {-90, 90}, cLength: {0, float64(maxLength / time.Second)}, cPriority: {0, maxPriority},
	cMinSpan: {0, float64(maxLength / time.Second)}, cReacquire: {0, 86400},
}

// row is one row of a table, or one object.
type row struct {
	line    int
	text    string
	bad     *Refusal
	refused bool

	name      string
	said      [numColumns]bool
	number    [numNumbers]float64
	rateAt    time.Time
	pointAt   time.Time
	refracted bool
	points    []closures.AimPoint
}

func (r *row) refuse(cause, mend string) {
	r.bad.add(r.line, r.text, cause, mend)
	r.refused = true
}

// set takes in a number that was read.
func (r *row) set(c column, v float64) {
	lo, hi := bounds[c][0], bounds[c][1]
	if !(v >= lo && v <= hi) {
		r.refuse(fmt.Sprintf("%s is outside %g to %g", columnNames[c], lo, hi), "correct it")
	}
	r.said[c], r.number[c] = true, v
}

// setTime takes in an instant as written.
func (r *row) setTime(c column, s string) {
	at, err := wire.ParseTime(s)
	if err != nil {
		r.refuse(columnNames[c]+" is not an instant", "write YYYY-MM-DDThh:mm:ssZ, with up to three decimals")
	}
	r.said[c] = true
	if c == cRateAt {
		r.rateAt = at
	} else {
		r.pointAt = at
	}
}

// setRefracted takes in a truth as written.
func (r *row) setRefracted(s string) {
	if s != "true" && s != "false" {
		r.refuse("refracted is neither true nor false", "write true or false")
	}
	r.said[cRefracted], r.refracted = true, s == "true"
}

// any reports whether one of the columns was said.
func (r *row) any(columns ...column) bool {
	for _, c := range columns {
		if r.said[c] {
			return true
		}
	}
	return false
}

// both refuses one of a pair without the other.
func (r *row) both(a, b column) bool {
	if r.said[a] != r.said[b] {
		r.refuse(columnNames[a]+" and "+columnNames[b]+" go together", "give both or neither")
	}
	return r.said[a] && r.said[b]
}

// target makes a target of what the row says. It may be refused.
func (r *row) target() Target {
	t := Target{
		Name: r.name, Length: seconds(r.number[cLength]), Priority: r.number[cPriority],
		Use: Use{MinSpan: seconds(r.number[cMinSpan]), Reacquire: seconds(r.number[cReacquire])},
	}
	if !usableName(r.name) {
		r.refuse("the name is not usable", "give 1 to 128 characters without control characters")
	}
	equator, horizon := r.both(cRA, cDec), r.both(cAz, cEl)
	ways := 0
	for _, is := range []bool{equator, horizon, len(r.points) > 0} {
		if is {
			ways++
		}
	}
	if ways != 1 && !r.refused {
		r.refuse("the row does not say in one way where the target is", "give ra_deg and dec_deg, or az_deg and el_deg, or an ephemeris")
	}
	if !equator && r.any(cPMRA, cPMDec, cRateRA, cRateDec, cRateAt) && !r.refused {
		r.refuse("a motion needs ra_deg and dec_deg", "leave it out")
	}
	if r.said[cRefracted] != horizon && !r.refused {
		r.refuse("refracted goes with az_deg and el_deg, and only there", "say there whether they are as seen through the air")
	}
	moving, rated := r.any(cPMRA, cPMDec), r.any(cRateRA, cRateDec)
	if moving && rated {
		r.refuse("the row has a proper motion and a rate", "give one of them")
	}
	if rated != r.said[cRateAt] {
		r.refuse("a rate and rate_at go together", "say at which instant the target is at ra_deg and dec_deg")
	}
	t.Aim = r.aim(horizon)
	if !t.Aim.Valid() && !r.refused {
		r.refuse("the ephemeris has steps of 90 degrees or more", "give its points more densely")
	}
	return t
}

// aim is what the row says of where the target is.
func (r *row) aim(horizon bool) *closures.Aim {
	a := &closures.Aim{Frame: closures.ICRS, Motion: closures.Tracking}
	switch {
	case horizon:
		a.Frame, a.Motion, a.Refracted = closures.Horizon, closures.Fixed, r.refracted
		a.Direction = geometry.FromHorizon(s1.Angle(r.number[cAz])*s1.Degree, s1.Angle(r.number[cEl])*s1.Degree)
	case len(r.points) > 0:
		a.Frame, a.Points = closures.Table, r.points
	default:
		const arcsec = math.Pi / 180 / 3600
		a.Direction = geometry.FromEquator(s1.Angle(r.number[cRA])*s1.Degree, s1.Angle(r.number[cDec])*s1.Degree)
		a.PMRA, a.PMDec = r.number[cPMRA]*arcsec/1000, r.number[cPMDec]*arcsec/1000
		a.RateRA, a.RateDec, a.Reference = r.number[cRateRA]*arcsec, r.number[cRateDec]*arcsec, r.rateAt
	}
	return a
}

// point adds a point of an ephemeris; what is wrong with it is the row from's.
func (r *row) point(from *row, at time.Time, ra, dec float64) {
	if n := len(r.points); n > 0 && !at.After(r.points[n-1].At) {
		from.refuse("the ephemeris is not in order of time", "put its points in order, each instant once")
		return
	}
	if len(r.points) == MaxPoints {
		from.refuse("the ephemeris is too long", fmt.Sprintf("give at most %d points", MaxPoints))
		return
	}
	r.points = append(r.points, closures.AimPoint{At: at, Direction: geometry.FromEquator(s1.Angle(ra)*s1.Degree, s1.Angle(dec)*s1.Degree)})
}

func seconds(s float64) time.Duration { return time.Duration(s * float64(time.Second)) }

func usableName(s string) bool {
	return s != "" && len(s) <= maxName && strings.TrimSpace(s) == s &&
		!strings.ContainsFunc(s, func(c rune) bool { return c < ' ' || c >= 0x7f && c < 0xa0 || c == '\uFFFD' })
}
