package crossing

import (
	"errors"
	"fmt"
	"math"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// Beam is one launch of a laser beam.
type Beam struct {
	// Site is the origin of the frame in which everything is stated.
	Site earth.Position
	// Launch is where the light leaves, in metres east, north and up of the
	// site.
	Launch r3.Vector
	// Radius is the beam's radius at the launch and Spread the half angle by
	// which it may widen: at s along the beam its radius is nowhere above
	// Radius + s Spread. For a geometry.Profile, half of its Aperture and half
	// of its Divergence are such a bound.
	Radius geometry.Length
	Spread s1.Angle
	// AimError is how far the true direction may be from the stated one, the
	// radius of an asterism included.
	AimError s1.Angle
	// Rate bounds how fast the beam turns, in rad/s.
	Rate float64
}

// Part is what shines of a beam between two heights above the ellipsoid. From
// at or below the launch's height means from the launch on.
type Part struct {
	From, Until geometry.Length
	// Halo is how much farther than the beam's edge the telescope minds its
	// light.
	Halo s1.Angle
}

// Usual heights above the ellipsoid of what shines: the air scatters enough to
// matter up to about 40 km, and the sodium layer is generally confined to 80
// to 110 km.
const (
	ColumnUntil geometry.Length = 40e3
	SodiumFrom  geometry.Length = 80e3
	SodiumUntil geometry.Length = 110e3
)

// Column is the scattering column, from the launch on.
func Column(halo s1.Angle) Part { return Part{From: lowest, Until: ColumnUntil, Halo: halo} }

// Sodium is the guide star that the sodium layer gives.
func Sodium(halo s1.Angle) Part { return Part{From: SodiumFrom, Until: SodiumUntil, Halo: halo} }

// Telescope is who must not see the beam.
type Telescope struct {
	// Position is the point about which the telescope turns, in metres east,
	// north and up of the beam's site.
	Position r3.Vector
	// Field is the radius of its field.
	Field s1.Angle
	// Aperture is the diameter of its aperture.
	Aperture geometry.Length
	// AimError is how far its true axis may be from the stated one.
	AimError s1.Angle
	// Rate bounds how fast its axis turns, in rad/s.
	Rate float64
}

// MaxParts is how many parts a beam may have.
const MaxParts = 4

// Bounds of what Prepare takes.
const (
	lowest   = -10e3 // of a height, in metres: below any ground
	highest  = 1000e3
	farthest = 400e3 // of launch and telescope from the site and each other
	widest   = 0.05  // of a spread or a beam's pointing error, in radians
)

// Pair is one launch of a beam against one telescope. Its zero value answers
// unknown.
type Pair struct {
	ready  bool
	frame  earth.Frame
	launch r3.Vector
	center center
	w      r3.Vector // from the telescope to the launch
	w2     float64   // |w|²
	radius float64   // R at the launch: half the aperture and the beam's radius
	grow   float64   // R's growth with s; how far a line of the beam may be turned from the stated one
	keep   float64   // the distance at the launch within which the beam is in the way
	omegaA float64
	omegaB float64
	n      int
	parts  [MaxParts]part
}

// part is a Part made ready.
type part struct {
	fromLaunch bool
	near, far  shell
	allowance  float64 // field, halo and the telescope's pointing error
}

// Prepare makes a pair ready. It refuses what is not finite, negative, or
// beyond what the package answers for.
func Prepare(b Beam, t Telescope, parts ...Part) (Pair, error) {
	if err := checkBeam(b); err != nil {
		return Pair{}, err
	}
	if err := checkTelescope(t); err != nil {
		return Pair{}, err
	}
	if len(parts) == 0 || len(parts) > MaxParts {
		return Pair{}, fmt.Errorf("a beam needs 1 to %d parts, not %d", MaxParts, len(parts))
	}
	w := b.Launch.Sub(t.Position)
	if w.Norm() > farthest {
		return Pair{}, fmt.Errorf("the telescope is %.0f km from the launch; it must lie within %.0f km", w.Norm()/1e3, farthest/1e3)
	}
	frame := earth.FrameAt(b.Site)
	launch := float64(earth.FromECEF(frame.ECEF(b.Launch)).Height)
	p := Pair{
		ready:  true,
		frame:  frame,
		launch: b.Launch,
		center: centerOf(frame, b.Launch),
		w:      w,
		w2:     w.Norm2(),
		radius: float64(b.Radius + t.Aperture/2),
		grow:   float64(b.Spread + b.AimError),
		keep:   float64(2*b.Radius + t.Aperture/2),
		omegaA: t.Rate,
		omegaB: b.Rate,
		n:      len(parts),
	}
	// The beam's rim reaches a height sooner and leaves it later than its axis. It
	// starts no more than the radius higher or lower, and its lines are turned by
	// no more than the spread and the pointing error.
	edge := float64(b.Radius)
	for i, o := range parts {
		if err := checkPart(o, launch); err != nil {
			return Pair{}, fmt.Errorf("part %d of the beam: %w", i+1, err)
		}
		near := shellAt(p.center, float64(o.From)-edge-offSurface*math.Abs(float64(o.From)))
		p.parts[i] = part{
			fromLaunch: near.gain <= 0,
			near:       near,
			far:        shellAt(p.center, float64(o.Until)+edge+offSurface*math.Abs(float64(o.Until))),
			allowance:  float64(t.Field + o.Halo + t.AimError),
		}
	}
	return p, nil
}

func checkBeam(b Beam) error {
	switch {
	case !geometry.FiniteVector(b.Launch) || !(b.Launch.Norm() <= farthest):
		return fmt.Errorf("the launch must lie within %.0f km of the site", farthest/1e3)
	case !b.Site.Valid():
		return errors.New("the site is not a position on Earth")
	case !(b.Radius > 0 && b.Radius <= 100):
		return errors.New("the beam's radius must be above 0 and at most 100 m")
	case !(b.Spread >= 0 && b.Spread <= widest):
		return errors.New("the beam's spread must be 0 to 0.05 rad")
	case !(b.AimError >= 0 && b.AimError <= widest):
		return errors.New("the beam's pointing error must be 0 to 0.05 rad")
	case !rate(b.Rate):
		return errors.New("the beam's rate must be 0 to 10 rad/s")
	}
	return nil
}

func checkTelescope(t Telescope) error {
	switch {
	case !geometry.FiniteVector(t.Position) || !(t.Position.Norm() <= farthest):
		return fmt.Errorf("the telescope must lie within %.0f km of the site", farthest/1e3)
	case !(t.Field >= 0 && t.Field <= math.Pi):
		return errors.New("the telescope's field radius must be 0 to π rad")
	case !(t.Aperture >= 0 && t.Aperture <= 200):
		return errors.New("the telescope's aperture must be 0 to 200 m")
	case !(t.AimError >= 0 && t.AimError <= math.Pi):
		return errors.New("the telescope's pointing error must be 0 to π rad")
	case !rate(t.Rate):
		return errors.New("the telescope's rate must be 0 to 10 rad/s")
	}
	return nil
}

func checkPart(o Part, launch float64) error {
	switch {
	case !(o.From >= lowest && o.Until <= highest && o.From < o.Until):
		return errors.New("its heights must rise, and lie between -10 and 1000 km")
	case !(float64(o.Until) > launch):
		return fmt.Errorf("it ends at %.0f m, not above the launch at %.0f m", float64(o.Until), launch)
	case !(o.Halo >= 0 && o.Halo <= math.Pi):
		return errors.New("its halo must be 0 to π rad")
	}
	return nil
}

func rate(r float64) bool { return r >= 0 && r <= 10 }
