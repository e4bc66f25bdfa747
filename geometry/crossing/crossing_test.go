package crossing

import (
	"fmt"
	"math"
	"sync"
	"testing"
)

// unsafe is how much more than the sampled least angle the package may say, in
// radians: the rounding of Earth-fixed positions of 6e6 m seen from 10 m.
const unsafe = 1e-9

// strict returns how much less than the sampled least angle the package may say
// where its least is s from the launch, in radians. The package takes one ball
// for two discs, which adds up to the angle that their radii subtend where a
// disc is seen from its edge. And it takes the ends of a part where they can be
// for any line of the beam's rim, to a metre: which adds up to twice the
// growth of the radius, and the radius, as seen along the beam.
func strict(v *volumes, s float64) float64 {
	up := max(v.launch.Normalize().Dot(v.beam), 0.02)
	along := (v.radius + 1 + 2*s*(v.spread+v.beamError)) / up
	return 1.05*v.ball(s) + along/v.launch.Add(v.beam.Mul(s)).Sub(v.telescope).Norm()
}

// TestBruteForce compares with dense sampling of both volumes, 200,000 pairs. BW-021
func TestBruteForce(t *testing.T) {
	type tally struct{ n, hits, way, near, differ int }
	var (
		mutex    sync.Mutex
		tallies  = make([]tally, len(families))
		tooClear = math.Inf(-1)
		tooTight = 0.0
	)
	share(t, count(200_000), func(r random, i int) error {
		f := (i / 2) % len(families)
		sc := families[f].draw(r)
		pair, err := Prepare(sc.beam, sc.telescope, sc.parts...)
		if err != nil {
			return err
		}
		got, want := pair.Margin(sc.beamDir, sc.axisDir), sc.volumes.search()
		tolerance := strict(&sc.volumes, float64(got.Slant))
		over, under := got.Margin-want.margin, want.margin-got.Margin
		mutex.Lock()
		defer mutex.Unlock()
		o := &tallies[f]
		o.n++
		if !(got.Margin > 0) {
			o.hits++
		}
		fault := ""
		switch {
		case math.IsNaN(got.Margin) || !(got.Rate >= 0):
			fault = "unknown"
		case got.InTheWay:
			o.way++
			// Within twice the radius, pointing error and all, of the aperture's sphere.
			if at := float64(got.Slant); want.nearest > sc.volumes.aperture/2+2*sc.volumes.beamError*at+1e-6 {
				fault = "said to be in the way"
			}
		case want.nearest <= 0:
			fault = "in the way and not said so"
		default:
			tooClear, tooTight = max(tooClear, over), max(tooTight, under/tolerance)
			if math.Abs(want.margin) < tolerance {
				o.near++
			}
			if got.Margin > 0 != (want.margin > 0) {
				o.differ++
			}
			if !(over <= unsafe) {
				fault = "too clear"
			} else if !(under <= tolerance) {
				fault = "too strict"
			}
		}
		if fault != "" {
			return fmt.Errorf("%s: %s: %+v, sampled %+v\n%+v\nbeam %v axis %v", families[f].name, fault, got, want, sc.volumes, sc.beamDir, sc.axisDir)
		}
		return nil
	})
	for i, f := range families {
		o := tallies[i]
		t.Logf("%-25s %6d pairs, %5d not clear (%5d in the way); %5d within the tolerance, of these %4d not clear where the samples are", f.name, o.n, o.hits, o.way, o.near, o.differ)
	}
	t.Logf("too clear by at most %.2g rad; too strict by at most %.2f of the tolerance", tooClear, tooTight)
}
