package crossing

import (
	"math"

	"github.com/golang/geo/r3"
)

// The brute force of this file knows nothing of the package: it places both
// volumes in the Earth-fixed frame, takes points of the beam's (its axis turned
// to every side by the pointing error, and its rim there) between two heights
// above the ellipsoid and points of the telescope's aperture, and looks for
// the pair whose line is nearest to the telescope's axis. Sampling finds no
// less than the least angle.

// wgs84 is the ellipsoid (NGA.STND.0036).
const (
	wgs84A  = 6378137.0
	wgs84F  = 1 / 298.257223563
	wgs84E2 = wgs84F * (2 - wgs84F)
)

// place is a geodetic position, in radians and metres.
type place struct{ lat, lon, height float64 }

func (p place) ecef() r3.Vector {
	sin, cos := math.Sincos(p.lat)
	n := wgs84A / math.Sqrt(1-wgs84E2*sin*sin)
	return r3.Vector{
		X: (n + p.height) * cos * math.Cos(p.lon),
		Y: (n + p.height) * cos * math.Sin(p.lon),
		Z: (n*(1-wgs84E2) + p.height) * sin,
	}
}

// toward returns the Earth-fixed direction at an azimuth and elevation of p.
func (p place) toward(az, el float64) r3.Vector {
	return p.ofLocal(math.Sin(az)*math.Cos(el), math.Cos(az)*math.Cos(el), math.Sin(el))
}

func (p place) ofLocal(e, n, u float64) r3.Vector {
	slat, clat := math.Sincos(p.lat)
	slon, clon := math.Sincos(p.lon)
	return r3.Vector{
		X: -slon*e - slat*clon*n + clat*clon*u,
		Y: clon*e - slat*slon*n + clat*slon*u,
		Z: clat*n + slat*u,
	}
}

// heightOf returns the height of an Earth-fixed point above the ellipsoid, by
// Newton's method on the parametric latitude; better than a millimetre up to
// 1000 km.
func heightOf(v r3.Vector) float64 {
	b := wgs84A * (1 - wgs84F)
	rho := math.Hypot(v.X, v.Y)
	s, c := v.Z*wgs84A, rho*b
	for range 3 {
		h := math.Hypot(s, c)
		s, c = s/h, c/h
		// Bowring's step toward the geodetic latitude, put back to the parametric.
		num := v.Z + (wgs84E2/(1-wgs84E2))*b*s*s*s
		den := rho - wgs84E2*wgs84A*c*c*c
		s, c = num*(1-wgs84F), den
	}
	h := math.Hypot(s, c)
	s, c = s/h, c/h
	foot := math.Hypot(rho-wgs84A*c, v.Z-b*s)
	if rho*c/wgs84A+v.Z*s/b < 1 {
		return -foot
	}
	return foot
}

// volumes is a beam against a field, in the Earth-fixed frame.
type volumes struct {
	launch, beam   r3.Vector
	radius, spread float64
	beamError      float64
	parts          [][2]float64
	telescope      r3.Vector
	axis           r3.Vector
	aperture       float64
	allowance      float64 // field, halo and the telescope's pointing error
}

// reaches returns the distance along a line from the launch at which it reaches
// a height, or 0 where it starts above.
func (v *volumes) reaches(dir r3.Vector, height float64) float64 {
	if heightOf(v.launch) >= height {
		return 0
	}
	// The height is convex along the line and near that over a sphere, so
	// Newton's steps with the slope of the latter close in.
	s := (height - heightOf(v.launch)) / max(0.02, dir.Dot(v.launch.Normalize()))
	for range 60 {
		x := v.launch.Add(dir.Mul(s))
		f := heightOf(x) - height
		s -= f / dir.Dot(x.Normalize())
		if math.Abs(f) < 1e-3 {
			return s
		}
	}
	panic("no crossing of the height")
}

// ball returns the angle as seen from the telescope that the radii of beam and
// aperture subtend where the beam's axis is s from the launch.
func (v *volumes) ball(s float64) float64 {
	d := v.launch.Add(v.beam.Mul(s)).Sub(v.telescope).Norm()
	return math.Asin(min(1, (v.radius+s*(v.spread+v.beamError)+v.aperture/2)/d))
}

// aside returns two unit vectors square to v and to each other.
func aside(v r3.Vector) (p, q r3.Vector) {
	p = v.Ortho()
	return p, v.Cross(p)
}

// found is what the search found.
type found struct {
	margin  float64 // the least sampled angle less the allowance
	nearest float64 // the least |axis point - telescope| less twice the radius there
	slack   float64 // (radius + aperture/2)/distance at the least: the angle that the volumes subtend
}

const (
	sides  = 6  // of the beam's and the aperture's rims
	coarse = 24 // points along the beam, before the nearest ones are looked at closely
)

// search looks for the least angle.
func (v *volumes) search() found {
	best := found{margin: math.Inf(1), nearest: math.Inf(1)}
	p, q := aside(v.beam)
	ap, aq := aside(v.axis)
	for k := range sides + 1 {
		dir, rim := v.beam, r3.Vector{}
		if k < sides {
			sin, cos := math.Sincos(2 * math.Pi * float64(k) / sides)
			out := p.Mul(cos).Add(q.Mul(sin))
			dir = v.beam.Mul(math.Cos(v.beamError)).Add(out.Mul(math.Sin(v.beamError)))
			rim = out.Sub(dir.Mul(out.Dot(dir))).Normalize()
		}
		at := func(s float64) r3.Vector {
			return v.launch.Add(dir.Mul(s)).Add(rim.Mul(v.radius + v.spread*s))
		}
		for _, part := range v.parts {
			from, until := v.reaches(dir, part[0]), v.reaches(dir, part[1])
			s := v.closest(from, until, dir, func(s float64) float64 {
				u := at(s).Sub(v.telescope)
				return -u.Dot(v.axis) / u.Norm()
			})
			x := at(s)
			for j := range sides + 1 {
				u := x.Sub(v.telescope)
				d := u.Norm()
				if j < sides {
					sin, cos := math.Sincos(2 * math.Pi * float64(j) / sides)
					u = u.Sub(ap.Mul(cos * v.aperture / 2)).Sub(aq.Mul(sin * v.aperture / 2))
				}
				if m := float64(u.Angle(v.axis)) - v.allowance; m < best.margin {
					best.margin = m
					best.slack = (v.radius + s*(v.spread+v.beamError) + v.aperture/2) / d
				}
			}
		}
	}
	gap := func(s float64) float64 {
		return v.launch.Add(v.beam.Mul(s)).Sub(v.telescope).Norm() - 2*(v.radius+v.spread*s)
	}
	best.nearest = gap(v.closest(0, 1e6, v.beam, gap))
	return best
}

// closest samples cost between two distances and returns where it was least:
// points at even steps of the angle at the telescope and at even steps of
// distance, then ever finer about the best.
func (v *volumes) closest(from, until float64, dir r3.Vector, cost func(s float64) float64) float64 {
	w := v.launch.Sub(v.telescope)
	along := w.Dot(dir)
	off := max(w.Sub(dir.Mul(along)).Norm(), 1e-3)
	a0, a1 := math.Atan((from+along)/off), math.Atan((until+along)/off)
	best, least, before, after := from, math.Inf(1), from, until
	try := func(s, lo, hi float64) {
		if s < from || s > until {
			return
		}
		if c := cost(s); c < least {
			best, least, before, after = s, c, lo, hi
		}
	}
	view := func(i float64) float64 { return off*math.Tan(a0+(a1-a0)*i/coarse) - along }
	even := func(i float64) float64 { return from + (until-from)*i/coarse }
	for i := 0.0; i <= coarse; i++ {
		try(view(i), view(i-1), view(i+1))
		try(even(i), even(i-1), even(i+1))
	}
	try(from, from, even(1))
	try(until, even(coarse-1), until)
	for range 7 {
		lo, hi := max(before, from), min(after, until)
		step := (hi - lo) / 8
		for i := 0.0; i <= 8; i++ {
			s := lo + i*step
			try(s, s-step, s+step)
		}
		before, after = best-step, best+step
	}
	return best
}
