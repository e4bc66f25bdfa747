package crossing

import (
	"math"
	"math/rand/v2"
	"os"
	"sync"
	"testing"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// scene is one random pair, stated twice: for the package and for the brute force.
type scene struct {
	beam      Beam
	telescope Telescope
	parts     []Part
	beamDir   r3.Vector
	axisDir   r3.Vector
	volumes   volumes
}

const arcsec = math.Pi / (180 * 3600)

type random struct{ *rand.Rand }

func (r random) between(a, b float64) float64 { return a + (b-a)*r.Float64() }

// log returns a number between a and b, each decade as likely.
func (r random) log(a, b float64) float64 { return a * math.Pow(b/a, r.Float64()) }

// around returns a unit vector at an angle from v, to a random side.
func (r random) around(v r3.Vector, angle float64) r3.Vector {
	p, q := aside(v)
	sin, cos := math.Sincos(2 * math.Pi * r.Float64())
	out := p.Mul(cos).Add(q.Mul(sin))
	return v.Mul(math.Cos(angle)).Add(out.Mul(math.Sin(angle))).Normalize()
}

// families are the kinds of pairs, the degenerate ones each for itself.
var families = []struct {
	name string
	draw func(r random) scene
}{
	{"near the edge", func(r random) scene { return draw(r, r.log(10, 200e3), r.between(10, 90), edge) }},
	{"anywhere", func(r random) scene { return draw(r, r.log(10, 200e3), r.between(10, 90), anywhere) }},
	{"parallel", func(r random) scene {
		return draw(r, r.log(10, 200e3), r.between(10, 90), func(r random, v *volumes) r3.Vector {
			return r.around(v.beam, r.log(1e-12, 1e-2))
		})
	}},
	{"anti-parallel", func(r random) scene {
		return draw(r, r.log(10, 200e3), r.between(10, 90), func(r random, v *volumes) r3.Vector {
			return r.around(v.beam.Mul(-1), r.log(1e-12, 1e-2))
		})
	}},
	{"launch inside the field", func(r random) scene {
		return draw(r, r.log(10, 5e3), r.between(10, 90), func(r random, v *volumes) r3.Vector {
			return r.around(v.launch.Sub(v.telescope).Normalize(), r.between(0, 1.3)*v.allowance)
		})
	}},
	{"beam below the telescope", func(r random) scene { return draw(r, r.log(2e3, 200e3), r.between(2, 15), edge) }},
	{"same place", func(r random) scene { return draw(r, r.between(0, 2), r.between(10, 90), anywhere) }},
	{"near the dome", func(r random) scene { return draw(r, r.between(5, 40), r.between(5, 60), edge) }},
	{"200 km", func(r random) scene { return draw(r, r.between(150e3, 200e3), r.between(10, 90), edge) }},
}

func anywhere(r random, v *volumes) r3.Vector {
	return r3.Vector{X: r.NormFloat64(), Y: r.NormFloat64(), Z: r.NormFloat64()}.Normalize()
}

// edge points the telescope beside a point of the beam, near where the field
// begins to hold it.
func edge(r random, v *volumes) r3.Vector {
	part := v.parts[r.IntN(len(v.parts))]
	from, until := v.reaches(v.beam, part[0]), v.reaches(v.beam, part[1])
	s := r.log(max(from, 1), until)
	switch r.IntN(4) {
	case 0:
		s = until
	case 1:
		s = from
	}
	u := v.launch.Add(v.beam.Mul(s)).Sub(v.telescope)
	ball := math.Asin(min(1, (v.radius+s*(v.spread+v.beamError)+v.aperture/2)/u.Norm()))
	return r.around(u.Normalize(), v.allowance+ball*r.between(-0.5, 2.5))
}

// draw returns a pair at a distance, with its beam at an elevation in degrees,
// and the telescope's axis by aim.
func draw(r random, distance, elevation float64, aim func(random, *volumes) r3.Vector) scene {
	site := place{r.between(-1.5, 1.5), r.between(-math.Pi, math.Pi), r.between(0, 5000)}
	theirs := site
	if distance > 5e3 {
		bearing := r.between(0, 2*math.Pi)
		theirs.lat += distance * math.Cos(bearing) / 6.371e6
		theirs.lon += distance * math.Sin(bearing) / 6.371e6 / math.Cos(site.lat)
		theirs.height = r.between(0, 5000)
	}
	launch := site.ecef().Add(site.ofLocal(r.between(-50, 50), r.between(-50, 50), r.between(0, 20)))
	v := volumes{
		launch:    launch,
		beam:      site.toward(r.between(0, 2*math.Pi), elevation*math.Pi/180),
		radius:    r.between(0.05, 0.5),
		spread:    r.log(1e-6, 1e-4),
		beamError: r.log(1e-6, 1e-3),
		telescope: theirs.ecef(),
		aperture:  r.log(0.1, 12),
		allowance: r.log(arcsec, 0.04),
	}
	if distance <= 5e3 {
		v.telescope = launch.Add(site.ofLocal(r.NormFloat64(), r.NormFloat64(), 0.3*r.NormFloat64()).Normalize().Mul(distance))
	}
	switch r.IntN(3) {
	case 0:
		v.parts = [][2]float64{{-10e3, 40e3}}
	case 1:
		v.parts = [][2]float64{{80e3, 110e3}}
	default:
		from := r.between(8e3, 30e3)
		v.parts = [][2]float64{{-10e3, 40e3}, {from, from + r.log(10, 10e3)}}
	}
	v.axis = aim(r, &v)
	return v.scene(site, r)
}

// scene states the volumes to the package, the allowance cut at random into
// field, halo and pointing error.
func (v volumes) scene(site place, r random) scene {
	origin := earth.Position{Lat: s1.Angle(site.lat), Lon: s1.Angle(site.lon), Height: geometry.Length(site.height)}
	frame := earth.FrameAt(origin)
	halo, aimError := v.allowance*r.between(0, 0.5), v.allowance*r.between(0, 0.5)
	sc := scene{
		beam: Beam{
			Site: origin, Launch: frame.ENU(v.launch),
			Radius: geometry.Length(v.radius), Spread: s1.Angle(v.spread), AimError: s1.Angle(v.beamError),
		},
		telescope: Telescope{
			Position: frame.ENU(v.telescope), Aperture: geometry.Length(v.aperture),
			Field: s1.Angle(v.allowance - halo - aimError), AimError: s1.Angle(aimError),
		},
		beamDir: frame.Turn(v.beam),
		axisDir: frame.Turn(v.axis),
		volumes: v,
	}
	for _, p := range v.parts {
		sc.parts = append(sc.parts, Part{From: geometry.Length(p[0]), Until: geometry.Length(p[1]), Halo: s1.Angle(halo)})
	}
	return sc
}

func newRand(seed uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, 20)) }

// count returns how many random cases to take: n, or many times that with
// BEAMWARD_LONG=1.
func count(n int) int {
	if os.Getenv("BEAMWARD_LONG") == "1" {
		return 20 * n
	}
	return n
}

// share runs n cases of work on two goroutines, each with its own random
// numbers.
func share(t *testing.T, n int, work func(r random, i int) error) {
	t.Helper()
	var wait sync.WaitGroup
	for k := range 2 {
		wait.Go(func() {
			r := random{newRand(uint64(n + k))}
			for i := k; i < n; i += 2 {
				if err := work(r, i); err != nil {
					t.Errorf("case %d: %v", i, err)
					return
				}
			}
		})
	}
	wait.Wait()
}
