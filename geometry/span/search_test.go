package span

import (
	"math"
	"testing"
	"time"
)

var noon = time.Date(2031, 2, 14, 12, 0, 0, 0, time.UTC)

// seconds returns the instant x seconds after noon.
func seconds(x float64) time.Time { return noon.Add(time.Duration(x * 1e9)) }

// tent is the margin that falls at speed v to zero at x = a, stays below it,
// and rises through zero again at x = b.
func tent(v, a, b float64) func(time.Time) float64 {
	return func(at time.Time) float64 {
		return v * (math.Abs(at.Sub(noon).Seconds()-(a+b)/2) - (b-a)/2)
	}
}

// Edges lie on the safe side and within the tolerance wherever the margin is
// crossed at an eighth of the bound or faster.
func TestEdges(t *testing.T) {
	const tolerance = 100 * time.Millisecond
	night := Span{noon, noon.Add(12 * time.Hour)}
	for k := 1.0; k <= 8; k += 0.125 {
		for _, width := range []float64{0, 0.01, 0.35, 8, 3600} {
			a := 20000.1234567
			found := Below(tent(1/k, a, a+width), 1, night, tolerance)
			if len(found) != 1 {
				t.Fatalf("1/%v of the rate, %v s wide: %v spans", k, width, len(found))
			}
			early, late := seconds(a).Sub(found[0].From), found[0].Until.Sub(seconds(a+width))
			if early < 0 || early > tolerance || late < 0 || late > tolerance {
				t.Errorf("1/%v of the rate, %v s wide: early %v, late %v", k, width, early, late)
			}
		}
	}
}

func TestSlowEdges(t *testing.T) {
	const tolerance = 100 * time.Millisecond
	night := Span{noon, noon.Add(12 * time.Hour)}
	for _, k := range []float64{10, 20, 50, 100, 1000} {
		a, b := 20000.1, 20100.9
		found := Below(tent(1/k, a, b), 1, night, tolerance)
		if len(found) != 1 {
			t.Fatalf("1/%v of the rate: %v spans", k, len(found))
		}
		early, late := seconds(a).Sub(found[0].From), found[0].Until.Sub(seconds(b))
		bound := time.Duration((k + 1) * float64(tolerance))
		if early < 0 || early > bound || late < 0 || late > bound {
			t.Errorf("1/%v of the rate: early %v, late %v, bound %v", k, early, late, bound)
		}
	}
}

// What is of no use closes the whole span.
func TestBelowFailsTowardTheWhole(t *testing.T) {
	over := Span{noon, noon.Add(time.Hour)}
	clear := func(time.Time) float64 { return 1 }
	for name, found := range map[string]Set{
		"rate NaN":           Below(clear, math.NaN(), over, time.Second),
		"rate infinite":      Below(clear, math.Inf(1), over, time.Second),
		"rate negative":      Below(clear, -1, over, time.Second),
		"tolerance zero":     Below(clear, 1, over, 0),
		"tolerance negative": Below(clear, 1, over, -time.Second),
		"margin NaN":         Below(func(time.Time) float64 { return math.NaN() }, 1, over, time.Second),
		"margin infinite":    Below(func(time.Time) float64 { return math.Inf(1) }, 1, over, time.Second),
		"margin zero":        Below(func(time.Time) float64 { return 0 }, 0, over, time.Second),
		"margin constant":    Below(func(time.Time) float64 { return -1e-300 }, 0, over, time.Second),
		"rated rate NaN":     BelowRated(func(time.Time) (float64, float64) { return 1, math.NaN() }, over, time.Second),
	} {
		if !found.Equal(Set{over}) {
			t.Errorf("%s: %v", name, found)
		}
	}
	century := Span{noon, noon.AddDate(500, 0, 0)}
	if found := Below(clear, 1, century, time.Second); !found.Equal(Set{century}) {
		t.Errorf("five centuries: %v", found)
	}
	if found := Below(clear, 0, over, time.Second); len(found) != 0 {
		t.Errorf("constant and clear: %v", found)
	}
	if found := Below(clear, math.NaN(), Span{}, time.Second); len(found) != 0 {
		t.Errorf("no time at all: %v", found)
	}
}

// A margin that is unknown for a while closes at least that while, and opens
// again within the tolerance.
func TestBelowUnknownForAWhile(t *testing.T) {
	over := Span{noon, noon.Add(12 * time.Hour)}
	unknown := Make(Span{seconds(0), seconds(77)}, Span{seconds(5000.05), seconds(9000.07)}, Span{seconds(40000), seconds(43199.5)})
	found := Below(func(at time.Time) float64 {
		if unknown.Contains(at) {
			return math.NaN()
		}
		return 1 + math.Sin(at.Sub(noon).Seconds()*1e-4)
	}, 1e-3, over, 100*time.Millisecond)
	if len(found) != 3 || len(unknown.Subtract(found)) != 0 {
		t.Fatalf("found %v for %v", found, unknown)
	}
	for i := range found {
		if late := found[i].Until.Sub(unknown[i].Until); late < 0 || late > 100*time.Millisecond {
			t.Errorf("span %d opens %v late", i, late)
		}
	}
}

// A margin that breaks its bound is not believed back to the last evaluation.
func TestBelowBrokenBound(t *testing.T) {
	over := Span{noon, noon.Add(1000 * time.Second)}
	step := func(at time.Time) float64 { // jumps from 1 to -1 at 150 s; the bound allows 0.01/s
		if at.Before(seconds(150)) {
			return 1
		}
		return -1
	}
	if found := Below(step, 0.01, over, time.Second); !found.Covers(Span{seconds(150), seconds(1000)}) {
		t.Errorf("%v", found)
	}
}

func TestAppendBelowJoins(t *testing.T) {
	margin := tent(1, 100, 200)
	var set Set
	for i := range 10 {
		set = AppendBelow(set, margin, 1, Span{seconds(float64(i) * 30), seconds(float64(i)*30 + 30)}, 10*time.Millisecond)
	}
	if len(set) != 1 || !set.Valid() || !set.Covers(Span{seconds(100), seconds(200)}) {
		t.Errorf("parts do not join: %v", set)
	}
	set = AppendBelow(Set{{seconds(150), seconds(500)}}, margin, 1, Span{noon, seconds(300)}, 10*time.Millisecond)
	if len(set) != 1 || !set.Valid() || !set.Covers(Span{seconds(100), seconds(500)}) {
		t.Errorf("a set out of order is not put right: %v", set)
	}
}

func TestBelowAllocatesNothing(t *testing.T) {
	scratch := make(Set, 0, 8)
	margin, over := tent(0.5, 100, 200), Span{noon, noon.Add(time.Hour)}
	if n := testing.AllocsPerRun(100, func() {
		scratch = AppendBelow(scratch[:0], margin, 1, over, time.Second)
	}); n != 0 {
		t.Errorf("%v allocations", n)
	}
}
