package span

import (
	"math"
	"slices"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// ticks is the slow twin of a set: for each second whether it holds it.
type ticks [40]bool

func second(i int) time.Time { return noon.Add(time.Duration(i) * time.Second) }

func drawSpan(t *rapid.T) Span {
	edge := rapid.IntRange(0, len(ticks{}))
	return Span{second(edge.Draw(t, "from")), second(edge.Draw(t, "until"))}
}

// drawSet returns a set of any spans, empty, inverted and overlapping ones
// among them, and its twin.
func drawSet(t *rapid.T, name string) (Set, ticks) {
	var spans []Span
	var twin ticks
	for range rapid.IntRange(0, 7).Draw(t, name) {
		o := drawSpan(t)
		spans = append(spans, o)
		for i := range twin {
			twin[i] = twin[i] || o.Contains(second(i))
		}
	}
	given := slices.Clone(spans)
	set := Make(spans...)
	if !slices.Equal(given, spans) {
		t.Fatal("Make changed what it was given")
	}
	same(t, "Make", set, twin)
	return set, twin
}

func same(t *rapid.T, what string, set Set, twin ticks) {
	t.Helper()
	if !set.Valid() {
		t.Fatalf("%s: %v is no set", what, set)
	}
	total := 0
	for i := range twin {
		if set.Contains(second(i)) != twin[i] || set.Contains(second(i+1).Add(-1)) != twin[i] {
			t.Fatalf("%s: %v is wrong at %d", what, set, i)
		}
		if twin[i] {
			total++
		}
	}
	if set.Total() != time.Duration(total)*time.Second {
		t.Fatalf("%s: %v lasts %v, want %d s", what, set, set.Total(), total)
	}
}

func TestSetAgainstTicks(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, inA := drawSet(t, "a")
		b, inB := drawSet(t, "b")
		over := drawSpan(t)
		combine := func(f func(a, b, over bool) bool) (out ticks) {
			for i := range out {
				out[i] = f(inA[i], inB[i], over.Contains(second(i)))
			}
			return out
		}
		same(t, "union", a.Union(b), combine(func(a, b, _ bool) bool { return a || b }))
		same(t, "intersection", a.Intersect(b), combine(func(a, b, _ bool) bool { return a && b }))
		same(t, "difference", a.Subtract(b), combine(func(a, b, _ bool) bool { return a && !b }))
		same(t, "within", a.Within(over), combine(func(a, _, over bool) bool { return a && over }))
		same(t, "complement", a.Complement(over), combine(func(a, _, over bool) bool { return over && !a }))
		if !a.Equal(a.Union(a)) || a.Equal(b) != (inA == inB) {
			t.Fatalf("equality of %v and %v", a, b)
		}

		covers, overlaps := true, false
		for i := range inA {
			if over.Contains(second(i)) {
				covers, overlaps = covers && inA[i], overlaps || inA[i]
			}
		}
		if a.Covers(over) != covers || a.Overlaps(over) != overlaps {
			t.Fatalf("%v: covers %v is %v, overlaps is %v", a, over, a.Covers(over), a.Overlaps(over))
		}
	})
}

func TestSetNext(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, in := drawSet(t, "a")
		from := rapid.IntRange(0, len(in)-1).Draw(t, "at")
		next, ok := a.Next(second(from))
		first := slices.Index(in[from:], true)
		switch {
		case ok != (first >= 0):
			t.Fatalf("next of %v at %d: %v %v", a, from, next, ok)
		case ok && first == 0 && !next.Contains(second(from)):
			t.Fatalf("next of %v at %d does not hold it: %v", a, from, next)
		case ok && first > 0 && !next.From.Equal(second(from+first)):
			t.Fatalf("next of %v at %d: %v", a, from, next)
		case !ok && (next != Span{} || a.At(second(from)) != len(a)):
			t.Fatalf("nothing after %d in %v: %v", from, a, next)
		}
		longest := Span{}
		for _, o := range a {
			if !a.Hull().Covers(o) {
				t.Fatalf("hull of %v: %v", a, a.Hull())
			}
			if o.Length() > longest.Length() {
				longest = o
			}
		}
		if a.Longest() != longest || len(a) == 0 && (a.Hull() != Span{}) {
			t.Fatalf("longest of %v: %v", a, a.Longest())
		}
	})
}

// Widening never opens and narrowing never closes, whatever the sign; narrowing
// undoes widening where nothing has met.
func TestWidenAndNarrow(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, in := drawSet(t, "a")
		shift := rapid.IntRange(-5, 5)
		lead, tail := shift.Draw(t, "lead"), shift.Draw(t, "tail")
		wide := a.Widen(time.Duration(lead)*time.Second, time.Duration(tail)*time.Second)
		thin := a.Narrow(time.Duration(lead)*time.Second, time.Duration(tail)*time.Second)
		var twin ticks
		for i := range twin {
			for j := max(i-max(tail, 0), 0); j <= min(i+max(lead, 0), len(in)-1); j++ {
				twin[i] = twin[i] || in[j]
			}
		}
		same(t, "widened", wide.Within(Span{second(0), second(len(in))}), twin)
		if !wide.Valid() || !thin.Valid() || len(a.Subtract(wide)) > 0 || len(thin.Subtract(a)) > 0 {
			t.Fatalf("%v by %d, %d: widened %v, narrowed %v", a, lead, tail, wide, thin)
		}
		var back ticks
		for i := range back {
			back[i] = in[i]
			for j := i - max(lead, 0); j <= i+max(tail, 0); j++ {
				back[i] = back[i] && j >= 0 && j < len(in) && in[j]
			}
		}
		same(t, "narrowed", thin, back)
	})
}

func TestSpan(t *testing.T) {
	s := Span{second(10), second(20)}
	for name, wrong := range map[string]bool{
		"zero is empty":            !(Span{}).Empty() || (Span{}).Length() != 0 || (Span{}).Contains(time.Time{}),
		"inverted is empty":        !(Span{second(2), second(1)}).Empty() || (Span{second(2), second(1)}).Length() != 0,
		"half-open":                !s.Contains(second(10)) || s.Contains(second(20)) || s.Contains(second(9)),
		"length":                   s.Length() != 10*time.Second,
		"covers itself":            !s.Covers(s) || !s.Covers(Span{}) || s.Covers(Span{second(10), second(21)}) || s.Covers(Span{second(9), second(12)}),
		"touching shares nothing":  s.Overlaps(Span{second(20), second(30)}) || s.Overlaps(Span{second(0), second(10)}),
		"overlaps":                 !s.Overlaps(Span{second(19), second(30)}),
		"empty overlaps nothing":   s.Overlaps(Span{second(15), second(15)}),
		"nothing shared is zero":   s.Intersect(Span{second(30), second(40)}) != Span{},
		"empty stays empty":        (Span{second(1), second(1)}).Widen(time.Hour, time.Hour) != Span{},
		"narrowed away":            s.Narrow(5*time.Second, 5*time.Second) != Span{},
		"a location says nothing":  !(Set{s}).Equal(Set{{s.From.In(time.FixedZone("", 3600)), s.Until}}),
		"an unordered set":         (Set{s, {second(1), second(2)}}).Valid(),
		"a set that touches":       (Set{s, {second(20), second(30)}}).Valid(),
		"a set with an empty span": (Set{{}}).Valid(),
	} {
		if wrong {
			t.Error(name)
		}
	}
	eon := time.Date(2300, 1, 1, 0, 0, 0, 0, time.UTC)
	var ages Set
	for i := range 3 {
		ages = append(ages, Span{eon.AddDate(200*i, 0, 0), eon.AddDate(200*i+199, 0, 0)})
	}
	if ages.Total() != math.MaxInt64 {
		t.Errorf("six centuries last %v", ages.Total())
	}
}

func TestAppendUsesTheMemoryItIsGiven(t *testing.T) {
	a := Make(Span{second(0), second(5)}, Span{second(10), second(15)}, Span{second(20), second(25)})
	b := Make(Span{second(3), second(12)}, Span{second(22), second(23)})
	dst := make(Set, 0, 16)
	for name, op := range map[string]func(dst, a, b Set) Set{"union": AppendUnion, "intersect": AppendIntersect, "subtract": AppendSubtract} {
		if n := testing.AllocsPerRun(20, func() { dst = op(dst, a, b) }); n != 0 {
			t.Errorf("%s: %v allocations", name, n)
		}
	}
}
