package crossing

import (
	"fmt"
	"math"
	"sync"
	"testing"

	"github.com/golang/geo/r3"
)

// turned returns v turned by an angle toward a direction, which need not be
// square to it.
func turned(v, toward r3.Vector, angle float64) r3.Vector {
	out := toward.Sub(v.Mul(v.Dot(toward)))
	if out.Norm() < 1e-9 {
		out = v.Ortho()
	}
	sin, cos := math.Sincos(angle)
	return v.Mul(cos).Add(out.Normalize().Mul(sin)).Normalize()
}

// TestRate turns beam and axis by no more than their rates, at random and
// straight at each other, and looks whether the margin keeps to its bound until
// it can have reached zero: 10^6 motions.
func TestRate(t *testing.T) {
	const motions = 50
	var (
		mutex     sync.Mutex
		most      float64
		n, zeroes int
	)
	share(t, count(1_000_000/motions), func(r random, i int) error {
		sc := families[(i/2)%len(families)].draw(r)
		sc.beam.Rate, sc.telescope.Rate = r.log(1e-6, 1e-2), r.log(1e-6, 1e-2)
		switch r.IntN(8) {
		case 0:
			sc.beam.Rate = 0
		case 1:
			sc.telescope.Rate = 0
		}
		pair, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			return err
		}
		now := pair.Margin(sc.beamDir, sc.axisDir)
		if !(now.Rate >= 0) || math.IsInf(now.Rate, 1) {
			return fmt.Errorf("rate of %+v", now)
		}
		reach := math.Min(math.Abs(now.Margin)/now.Rate, 1e9)
		point := sc.beam.Launch.Add(sc.beamDir.Mul(float64(now.Slant))).Sub(sc.telescope.Position)
		used, touched := 0.0, 0
		for range motions {
			after := reach * math.Sqrt(r.Float64()) * (1 - 1e-9)
			axis, beam := sc.axisDir, sc.beamDir
			at := r.around(axis, math.Pi/2)
			bt := r.around(beam, math.Pi/2)
			switch r.IntN(4) {
			case 0: // the axis to the point of least margin and the point to the axis
				at, bt = point.Normalize(), sc.axisDir.Sub(point.Normalize())
			case 1: // away from each other
				at, bt = point.Normalize().Mul(-1), point.Normalize().Sub(sc.axisDir)
			case 2: // the beam to the telescope
				bt = sc.telescope.Position.Sub(sc.beam.Launch)
			}
			axis = turned(axis, at, min(sc.telescope.Rate*after, 100))
			beam = turned(beam, bt, min(sc.beam.Rate*after, 100))
			then := pair.Margin(beam, axis)
			change := now.Margin - then.Margin
			if now.Margin <= 0 {
				change = -change
			}
			if slack := 1e-9 + 1e-9*math.Abs(now.Margin); !(change <= now.Rate*after+slack) || math.IsNaN(then.Margin) || (now.Margin > slack && !(then.Margin > 0)) {
				return fmt.Errorf("%s: after %g s of %g: %+v, then %+v\n%+v\n%+v %v %v, then %v %v", families[(i/2)%len(families)].name, after, reach, now, then, sc.beam, sc.telescope, sc.beamDir, sc.axisDir, beam, axis)
			}
			if now.Rate*after > 1e-6 {
				used = max(used, change/(now.Rate*after))
			}
			if now.Margin > 0 && then.Margin < 0.1*now.Margin {
				touched++
			}
		}
		mutex.Lock()
		defer mutex.Unlock()
		n += motions
		zeroes += touched
		most = max(most, used)
		return nil
	})
	t.Logf("%d motions; the margin changed by at most %.3f of its bound; %d motions used up 90 %% of a margin", n, most, zeroes)
}

// TestRateIsNotWasted checks that the bound is not much above the plain
// ω_a + ω_b s/|w + s b| where the margin is small: what is left is the beam's
// width and the movement of the heights.
func TestRateIsNotWasted(t *testing.T) {
	r := random{newRand(3)}
	worst := 0.0
	for range 20_000 {
		sc := families[0].draw(r)
		sc.beam.AimError = 1e-4
		sc.beam.Rate, sc.telescope.Rate = 7.3e-5, 7.3e-5
		pair, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			t.Fatal(err)
		}
		got := pair.Margin(sc.beamDir, sc.axisDir)
		if !(got.Margin > 0 && got.Margin < 0.05) || sc.volumes.ball(float64(got.Slant)) > 0.1 || sc.beamDir.Z < 0.5 {
			continue
		}
		plain := 0.0
		for s := 1.0; s < 2e5; s *= 1.1 {
			plain = max(plain, s/sc.beam.Launch.Add(sc.beamDir.Mul(s)).Sub(sc.telescope.Position).Norm())
		}
		worst = max(worst, got.Rate/(7.3e-5*(1+plain)))
	}
	t.Logf("at most %.2f times the plain bound", worst)
	if worst > 2.5 {
		t.Errorf("the rate is up to %.2f times the plain bound", worst)
	}
}
