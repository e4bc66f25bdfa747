package crossing

import (
	"fmt"
	"math"
	"testing"

	"beamward/geometry"
	"beamward/geometry/earth"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
)

// TestMoreAllowanceIsNeverClearer makes one allowance larger at a time.
func TestMoreAllowanceIsNeverClearer(t *testing.T) {
	share(t, count(30_000), func(r random, i int) error {
		sc := families[(i/2)%len(families)].draw(r)
		before, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			return err
		}
		was := before.Margin(sc.beamDir, sc.axisDir)
		what := ""
		more := r.log(1e-7, 1e-2)
		parts := append([]Part(nil), sc.parts...)
		switch r.IntN(10) {
		case 0:
			what, sc.telescope.Field = "field", sc.telescope.Field+s1.Angle(more)
		case 1:
			what, sc.telescope.AimError = "telescope's error", sc.telescope.AimError+s1.Angle(more)
		case 2:
			what, sc.telescope.Aperture = "aperture", sc.telescope.Aperture+geometry.Length(100*more)
		case 3:
			what, sc.beam.AimError = "beam's error", sc.beam.AimError+s1.Angle(more)
		case 4:
			what, sc.beam.Spread = "spread", sc.beam.Spread+s1.Angle(more)
		case 5:
			what, sc.beam.Radius = "radius", sc.beam.Radius+geometry.Length(100*more)
		case 6:
			what, parts[0].Halo = "halo", parts[0].Halo+s1.Angle(more)
		case 7:
			what, parts[0].Until = "top", parts[0].Until+geometry.Length(1e6*more)
		case 8:
			what, parts[0].From = "bottom", max(parts[0].From-geometry.Length(1e6*more), lowest)
		case 9:
			what, parts = "another part", append(parts, Sodium(0))
		}
		after, err := Prepare(sc.beam, sc.telescope, parts...)
		if err != nil {
			return err
		}
		if now := after.Margin(sc.beamDir, sc.axisDir); !(now.Margin <= was.Margin+1e-9) {
			return fmt.Errorf("larger %s: %+v, then %+v", what, was, now)
		}
		return nil
	})
}

// TestTurnedScene mirrors the scene through the meridian and through the
// equator, and turns it about the Earth's axis, which at a pole is the vertical:
// all that leaves the ellipsoid as it is.
func TestTurnedScene(t *testing.T) {
	share(t, count(30_000), func(r random, i int) error {
		sc := families[(i/2)%len(families)].draw(r)
		angle := r.between(0, 2*math.Pi)
		turn := func(v r3.Vector) r3.Vector { return v }
		what := ""
		switch r.IntN(4) {
		case 0:
			what, turn = "mirrored east to west", func(v r3.Vector) r3.Vector { return r3.Vector{X: -v.X, Y: v.Y, Z: v.Z} }
		case 1:
			what, turn = "mirrored north to south", func(v r3.Vector) r3.Vector { return r3.Vector{X: v.X, Y: -v.Y, Z: v.Z} }
		case 2:
			what = "turned about the Earth's axis"
		case 3:
			what = "turned at the pole"
			sc.beam.Site.Lat = math.Pi / 2
			sin, cos := math.Sincos(angle)
			turn = func(v r3.Vector) r3.Vector { return r3.Vector{X: v.X*cos - v.Y*sin, Y: v.X*sin + v.Y*cos, Z: v.Z} }
		}
		one, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			return err
		}
		was := one.Margin(sc.beamDir, sc.axisDir)
		sc.beam.Launch, sc.telescope.Position = turn(sc.beam.Launch), turn(sc.telescope.Position)
		switch what {
		case "mirrored north to south":
			sc.beam.Site.Lat *= -1
		case "turned about the Earth's axis":
			sc.beam.Site.Lon = s1.Angle(angle - math.Pi)
		}
		other, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			return err
		}
		now := other.Margin(turn(sc.beamDir), turn(sc.axisDir))
		if !(math.Abs(now.Margin-was.Margin) <= 1e-9) || now.InTheWay != was.InTheWay {
			return fmt.Errorf("%s: %+v, then %+v", what, was, now)
		}
		return nil
	})
}

// TestFromAnotherSite states one scene in the beam site's frame and in that of
// a third place 200 km away: the same answer.
func TestFromAnotherSite(t *testing.T) {
	share(t, count(20_000), func(r random, i int) error {
		sc := families[(i/2)%len(families)].draw(r)
		one, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			return err
		}
		was := one.Margin(sc.beamDir, sc.axisDir)
		here := earth.FrameAt(sc.beam.Site)
		third := sc.beam.Site.Offset(r3.Vector{X: r.between(-1, 1), Y: r.between(-1, 1)}.Mul(140e3))
		there := earth.FrameAt(third)
		move := func(v r3.Vector) r3.Vector { return there.ENU(here.ECEF(v)) }
		sc.beam.Site, sc.beam.Launch, sc.telescope.Position = third, move(sc.beam.Launch), move(sc.telescope.Position)
		other, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			return err
		}
		now := other.Margin(Turn(sc.beamDir, here, there), Turn(sc.axisDir, here, there))
		// 1e-9 m of Earth-fixed rounding, seen from half a metre.
		if !(math.Abs(now.Margin-was.Margin) <= 2e-8) || now.InTheWay != was.InTheWay {
			return fmt.Errorf("%s: %+v, then %+v", families[(i/2)%len(families)].name, was, now)
		}
		return nil
	})
}

// TestAnd joins answers: the least margin, and a rate under which neither is
// used up before the joined bound says so.
func TestAnd(t *testing.T) {
	nan := math.NaN()
	for _, c := range []struct{ a, b, want Result }{
		{Result{Margin: 1, Rate: 1}, Result{Margin: 2, Rate: 1, Part: 1}, Result{Margin: 1, Rate: 1}},
		{Result{Margin: 1, Rate: 1}, Result{Margin: 2, Rate: 8, Part: 1}, Result{Margin: 1, Rate: 4}},
		{Result{Margin: 1, Rate: 1}, Result{Margin: -2, Rate: 8}, Result{Margin: -2, Rate: 8}},
		{Result{Margin: 0, Rate: 1}, Result{Margin: 3, Rate: 8}, Result{Margin: 0, Rate: 1}},
	} {
		for _, got := range []Result{c.a.And(c.b), c.b.And(c.a)} {
			if got != c.want {
				t.Errorf("%+v and %+v: %+v, want %+v", c.a, c.b, got, c.want)
			}
		}
	}
	for _, o := range []Result{{Margin: 1, Rate: 1}, {Margin: -1, Rate: 1}} {
		for _, u := range []Result{{Margin: nan, Rate: 1}, {Margin: 1, Rate: nan}, {Margin: nan, Rate: nan}} {
			for _, got := range []Result{o.And(u), u.And(o)} {
				if !math.IsNaN(got.Margin) && !math.IsNaN(got.Rate) {
					t.Errorf("%+v and %+v: %+v", o, u, got)
				}
			}
		}
	}
}
