package recheck

import (
	"time"

	"beamward/closures"
)

// aim is one beam's aim and how surely it is known.
type aim struct {
	*closures.Aim
	site place
	pad  float64 // from the aim to the farthest light: errors and asterism
}

// own is the aim in its own frame at an instant.
func (a *aim) own(at time.Time) (point, bool) {
	if a.Frame == closures.Table {
		return walk(a.Points, at)
	}
	var p point
	if a.Frame == closures.Horizon {
		p = horizontal(a.Direction)
	} else {
		p = equatorial(a.Direction)
	}
	if a.PMRA != 0 || a.PMDec != 0 {
		const year = 365.25 * 24
		p = along(p, a.PMRA, a.PMDec, at.Sub(j2000).Hours()/year)
	}
	if a.RateRA != 0 || a.RateDec != 0 {
		p = along(p, a.RateRA, a.RateDec, at.Sub(a.Reference).Seconds())
	}
	return p, p.finite()
}

// walk is where a table of ICRS points stands at an instant: on the chord
// between two of them.
func walk(points []closures.AimPoint, at time.Time) (point, bool) {
	for i := 1; i < len(points); i++ {
		p, q := &points[i-1], &points[i]
		if at.Before(p.At) || at.After(q.At) {
			continue
		}
		f := at.Sub(p.At).Seconds() / q.At.Sub(p.At).Seconds()
		v := p.Direction.Mul(1 - f).Add(q.Direction.Mul(f))
		if n := v.Norm(); n > 0 {
			o := equatorial(v.Mul(1 / n))
			return o, o.finite()
		}
		return point{}, false
	}
	return point{}, false
}

// local is the aim's azimuth and elevation, within Unsure.
func (a *aim) local(at time.Time) (point, bool) {
	p, ok := a.own(at)
	if !ok {
		return point{}, false
	}
	switch a.Frame {
	case closures.ICRS, closures.Table:
		p = a.site.local(p, at)
	case closures.OfDate:
		p = a.site.ofDate(p, at)
	case closures.Horizon:
	default:
		return point{}, false
	}
	return p, p.finite()
}

// stars is the aim against the stars of J2000.0, and how unsure that is.
func (a *aim) stars(at time.Time) (p point, unsure float64, ok bool) {
	if p, ok = a.own(at); !ok {
		return point{}, 0, false
	}
	switch a.Frame {
	case closures.ICRS, closures.Table:
		return p, arcsec, true
	case closures.OfDate:
		p = precessionAt(at).fromDate(p)
	case closures.Horizon:
		p = a.site.stars(p, at)
	default:
		return point{}, 0, false
	}
	return p, Unsure, p.finite()
}

// asSaid reports whether the aim that the decision used is the one that was
// said, but for refraction and for turning an azimuth and elevation to the
// stars.
func (a *aim) asSaid(said *closures.Aim) bool {
	if said == nil {
		return false
	}
	s := aim{Aim: said, site: a.site}
	at := a.Reference
	if a.Frame == closures.Table {
		return said.Frame == a.Frame && len(said.Points) == len(a.Points)
	}
	p, ok1 := a.own(at)
	q, ok2 := s.own(at)
	switch {
	case !ok1 || !ok2:
		return false
	case a.Frame == said.Frame && a.Frame != closures.Horizon:
		return apart(p, q) <= arcsec
	case a.Frame == closures.ICRS && said.Frame == closures.Horizon:
		p = a.site.local(p, at)
	case a.Frame != said.Frame:
		return false
	}
	allowed := float64(Unsure)
	if said.Refracted {
		allowed += lifted(min(p.lat, q.lat))
	}
	return apart(p, q) <= allowed
}
