package permit

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"pgregory.net/rapid"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry/span"
)

var evening = time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)

// stage is a source and a clock that stand still.
type stage struct {
	mu    sync.Mutex
	sight Sight
	wall  time.Time
	boot  time.Duration
}

func newStage() *stage {
	r := &closures.Rules{Permit: closures.PermitRules{Lease: 2 * time.Second, Renew: 500 * time.Millisecond, DecisionInterval: 100 * time.Millisecond, ConsumerClockError: 200 * time.Millisecond}}
	return &stage{
		wall: evening, boot: time.Hour,
		sight: Sight{At: evening, Boot: time.Hour, BootID: "boot-1", Number: 7, Rules: r, Decision: &closures.Decision{
			Seq: 42, Beam: "north", At: evening, Open: true, Rules: closures.Digest{1}, Lists: closures.Digest{2},
			Inputs:   []closures.Input{{Source: "north", Age: 20 * time.Millisecond, Limit: 3 * time.Second}, {Source: "rx-1", Age: -1, Limit: 10 * time.Second}},
			Cautions: []closures.Caution{{Code: closures.CodeSourceSilent, Source: "rx-1", Detail: "the source is silent"}},
		}},
	}
}

func (s *stage) Sight(b closures.BeamID) (Sight, bool) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.sight, b == s.sight.Decision.Beam
}

func (s *stage) Pulse() (time.Time, time.Duration, *closures.Rules) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.sight.At, s.sight.Boot, s.sight.Rules
}

func (s *stage) Read() (time.Time, time.Duration) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.wall, s.boot
}

func (s *stage) advance(d time.Duration) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.wall, s.boot = s.wall.Add(d), s.boot+d
}

// decision changes a copy of the decision, as the engine would publish it.
func (s *stage) decision(f func(*closures.Decision)) {
	s.mu.Lock()
	defer s.mu.Unlock()
	d := *s.sight.Decision
	f(&d)
	s.sight.Decision = &d
	s.sight.Number++
}

func issuer(t testing.TB, s *stage) *Issuer {
	t.Helper()
	k, err := LoadKey(t.TempDir())
	if err != nil {
		t.Fatal(err)
	}
	i, err := New(s, s, k, false)
	if err != nil {
		t.Fatal(err)
	}
	return i
}

// ask makes a permit and reads it back as a verifier does.
func ask(t testing.TB, i *Issuer, nonce string) wire.Permit {
	t.Helper()
	p, err := i.Permit("north", nonce)
	if err != nil {
		t.Fatal(err)
	}
	q, err := wire.VerifyPermit(p.Signed, i.Key().Public())
	if err != nil {
		t.Fatalf("%v\n%s", err, wire.PayloadOf(&p))
	}
	if string(wire.PayloadOf(&p)) != string(wire.PayloadOf(&q)) {
		t.Fatal("the payload says otherwise than the permit")
	}
	return q
}

func TestLease(t *testing.T) {
	const ms = time.Millisecond
	for name, c := range map[string]struct {
		openUntil time.Duration // after the decision; 0: no closure in sight
		now       time.Duration // after the decision
		until     time.Duration // 0: shuttered
		lease     int64         // ms
	}{
		"at the decision":                  {0, 0, 2000 * ms, 2000},
		"later":                            {0, 300 * ms, 2000 * ms, 1700},
		"a closure after the lease":        {2001 * ms, 0, 2000 * ms, 2000},
		"a closure at its end":             {2000 * ms, 0, 2000 * ms, 2000},
		"a closure within the lease":       {700 * ms, 100 * ms, 700 * ms, 600},
		"rounded down":                     {700*ms + 999*time.Microsecond, 0, 700 * ms, 700},
		"issued rounded up":                {700 * ms, 100*ms + 1, 700 * ms, 599},
		"less than a millisecond is left":  {100*ms + 500*time.Microsecond, 100*ms + 1, 0, 0},
		"the closure's margin has come":    {100 * ms, 100 * ms, 0, 0},
		"the closure's margin has gone by": {100 * ms, 250 * ms, 0, 0},
		"the last instant before":          {100 * ms, 99 * ms, 100 * ms, 1},
	} {
		t.Run(name, func(t *testing.T) {
			s := newStage()
			s.decision(func(d *closures.Decision) {
				if c.openUntil == 0 {
					return
				}
				d.OpenUntil = evening.Add(c.openUntil)
				d.ClosesAt = d.OpenUntil.Add(700 * ms)
				d.Coming = []closures.Finding{{Code: closures.CodeListedClosure, Source: "orbital-desk", Verdict: closures.Violated,
					Over: span.Span{From: d.ClosesAt, Until: d.ClosesAt.Add(time.Minute)}, Detail: "a closure window"}}
			})
			s.advance(c.now)
			p := ask(t, issuer(t, s), "n")
			if c.until == 0 {
				if p.State != wire.Shuttered || p.LeaseMS != 0 || p.ValidUntil != p.IssuedAt {
					t.Fatalf("%v until %v, %d ms", p.State, p.ValidUntil, p.LeaseMS)
				}
				if len(p.Reasons) != 1 || p.Reasons[0].Code != "listed-closure" {
					t.Fatalf("reasons: %+v", p.Reasons)
				}
				return
			}
			if p.State != wire.Open || !p.ValidUntil.Equal(evening.Add(c.until)) || p.LeaseMS != c.lease {
				t.Fatalf("%v until %v, %d ms", p.State, p.ValidUntil.Sub(evening), p.LeaseMS)
			}
			if got := p.ValidUntil.Sub(p.IssuedAt); got != p.Lease() {
				t.Fatalf("%v from issued_at to valid_until, and a lease of %v", got, p.Lease())
			}
		})
	}
}

func TestFields(t *testing.T) {
	s := newStage()
	i := issuer(t, s)
	s.advance(50 * time.Millisecond)
	p := ask(t, i, "abc_-9")
	if p.Beam != "north" || p.Seq != 42 || p.BootID != "boot-1" || p.Nonce != "abc_-9" || p.Simulated {
		t.Errorf("%+v", p)
	}
	if p.RulesDigest != (closures.Digest{1}).String() || p.ListsDigest != (closures.Digest{2}).String() {
		t.Errorf("digests: %s %s", p.RulesDigest, p.ListsDigest)
	}
	if len(p.Inputs) != 2 || *p.Inputs[0].AgeS != 0.07 || p.Inputs[1].AgeS != nil || p.Inputs[0].LimitS != 3 {
		t.Errorf("inputs: %+v", p.Inputs)
	}
	if len(p.Cautions) != 1 || p.Cautions[0].Code != "source-silent" {
		t.Errorf("cautions: %+v", p.Cautions)
	}
	b, err := i.Answer("north", "abc_-9")
	if err != nil {
		t.Fatal(err)
	}
	var keys map[string]json.RawMessage
	if err := json.Unmarshal(b, &keys); err != nil {
		t.Fatal(err)
	}
	for _, k := range strings.Fields("beam state seq boot_id issued_at valid_until lease_ms reasons cautions closes_at opens_at inputs rules_digest lists_digest simulated nonce signed") {
		if _, ok := keys[k]; !ok {
			t.Errorf("no field %s", k)
		}
		delete(keys, k)
	}
	if len(keys) != 0 {
		t.Errorf("fields nobody asked for: %v", keys)
	}
	s.decision(func(d *closures.Decision) {
		d.Open, d.OpensAt = false, evening.Add(time.Minute)
		d.Reasons = []closures.Finding{{Code: closures.CodeHold, Verdict: closures.Violated, Detail: "a person holds the beam"}}
	})
	p = ask(t, i, "")
	if p.State != wire.Shuttered || len(p.Reasons) != 1 || p.Reasons[0].Code != "hold" || p.OpensAt == nil {
		t.Errorf("%+v", p)
	}
}

func TestOpenWithReasonsIsShuttered(t *testing.T) {
	s := newStage()
	s.decision(func(d *closures.Decision) { d.Reasons = []closures.Finding{{Code: closures.CodeHold}} })
	if p := ask(t, issuer(t, s), ""); p.State != wire.Shuttered {
		t.Fatal("open with a reason not to be")
	}
}

// BW-009
func TestStaleIsShuttered(t *testing.T) {
	const limit = 300 * time.Millisecond
	for name, c := range map[string]struct {
		wall, boot time.Duration
		code       string // empty: believed
	}{
		"at the limit":           {limit, limit, ""},
		"both clocks":            {limit + 1, limit + 1, "fault"},
		"the boot clock":         {limit, limit + 1, "fault"},
		"the wall clock":         {limit + 1, limit, "clock"},
		"a step ahead":           {time.Hour, time.Millisecond, "clock"},
		"a step back":            {-1, time.Millisecond, "clock"},
		"a step back while hung": {-time.Hour, time.Second, "clock"},
		"the boot clock back":    {0, -1, "fault"},
	} {
		s := newStage()
		s.wall, s.boot = s.wall.Add(c.wall), s.boot+c.boot
		i := issuer(t, s)
		p := ask(t, i, "")
		if open := p.State == wire.Open; open != (c.code == "") || i.Fresh() != open {
			t.Errorf("%s: %v, fresh %v", name, p.State, i.Fresh())
			continue
		}
		if c.code != "" && (len(p.Reasons) != 1 || p.Reasons[0].Code != c.code || p.OpensAt != nil) {
			t.Errorf("%s: %+v", name, p.Reasons)
		}
	}
}

// Whatever the decision and the time, an open permit ends by both bounds and a
// reader without UTC ends no later than one with it.
func TestLeaseHoldsItsBounds(t *testing.T) {
	s := newStage()
	i := issuer(t, s)
	rapid.Check(t, func(t *rapid.T) {
		d := *newStage().sight.Decision
		ns := func(name string, most time.Duration) time.Duration {
			return time.Duration(rapid.Int64Range(-int64(most)/4, int64(most)).Draw(t, name))
		}
		d.Open = rapid.IntRange(0, 9).Draw(t, "open") > 0
		if rapid.Bool().Draw(t, "closes") {
			d.OpenUntil = evening.Add(ns("open until", 4*time.Second))
			d.ClosesAt = d.OpenUntil.Add(700 * time.Millisecond)
		}
		s.mu.Lock()
		s.sight.Decision = &d
		s.sight.Number++
		s.wall, s.boot = evening.Add(ns("wall", 500*time.Millisecond)), time.Hour+ns("boot", 500*time.Millisecond)
		wall, boot := s.wall, s.boot
		s.mu.Unlock()
		for _, nonce := range []string{"n", ""} {
			b, err := i.Answer("north", nonce)
			if err != nil {
				t.Fatal(err)
			}
			p, err := wire.ParsePermit(b)
			if err != nil {
				t.Fatal(err)
			}
			if p.State == wire.Shuttered {
				continue
			}
			switch {
			case !d.Open:
				t.Fatal("open against the decision")
			case wall.Sub(evening) > 300*time.Millisecond || boot-time.Hour > 300*time.Millisecond || wall.Before(evening) || boot < time.Hour:
				t.Fatal("open on a stale decision")
			case p.ValidUntil.After(evening.Add(2*time.Second)) || !d.OpenUntil.IsZero() && p.ValidUntil.After(d.OpenUntil):
				t.Fatalf("valid until %v", p.ValidUntil)
			case !p.ValidUntil.After(wall):
				t.Fatal("open for no time")
			case wall.Add(p.Lease()).After(p.ValidUntil): // the request was sent before now
				t.Fatalf("%v from now is past %v", p.Lease(), p.ValidUntil)
			}
		}
	})
}

func TestCacheSignsOncePerViewAndSlot(t *testing.T) {
	s := newStage()
	s.advance(3 * time.Millisecond)
	i := issuer(t, s)
	get := func() string {
		t.Helper()
		b, err := i.Answer("north", "")
		if err != nil {
			t.Fatal(err)
		}
		p, err := wire.ParsePermit(b)
		if err != nil {
			t.Fatal(err)
		}
		wall, _ := s.Read()
		if ahead := p.IssuedAt.Sub(wall); ahead < 0 || ahead > slot+time.Millisecond {
			t.Fatalf("issued %v ahead", ahead)
		}
		return string(b)
	}
	first := get()
	var readers sync.WaitGroup
	for range 8 {
		readers.Go(func() {
			for range 100 {
				if b, err := i.Answer("north", ""); err != nil || string(b) != first {
					t.Error("another permit in one slot")
				}
			}
		})
	}
	readers.Wait()
	if n := i.Signed(); n != 1 {
		t.Fatalf("%d signatures for one slot", n)
	}
	s.advance(6 * time.Millisecond)
	get()
	if i.Signed() != 1 {
		t.Fatal("signed again in the slot")
	}
	s.advance(2 * time.Millisecond)
	get()
	if i.Signed() != 2 {
		t.Fatal("not signed anew in the next slot")
	}
	s.decision(func(d *closures.Decision) {
		d.Open, d.Reasons = false, []closures.Finding{{Code: closures.CodeHold, Verdict: closures.Violated}}
	})
	if b := get(); !strings.Contains(b, `"shuttered"`) {
		t.Fatal("a withdrawn view was answered from the cache")
	}
	s.wall = s.wall.Add(-time.Second) // the wall clock went back within a slot
	if p, _ := wire.ParsePermit(must(i.Answer("north", ""))); p.State != wire.Shuttered {
		t.Fatal("served from a slot of another wall time")
	}
	if get2, _ := i.Answer("north", "x"); !strings.Contains(string(get2), `"nonce":"x"`) {
		t.Fatal("the nonce is not echoed")
	}
}

func must(b []byte, err error) []byte {
	if err != nil {
		panic(err)
	}
	return b
}

func TestRefusals(t *testing.T) {
	s := newStage()
	i := issuer(t, s)
	if _, err := i.Permit("south", ""); codeOf(err) != closures.NotFound {
		t.Errorf("an unknown beam: %v", err)
	}
	for _, nonce := range []string{strings.Repeat("a", 65), "a b", "ä", "a\n", "a.b", "\x00", "<"} {
		if _, err := i.Answer("north", nonce); codeOf(err) != closures.Invalid {
			t.Errorf("nonce %q: %v", nonce, err)
		}
	}
	if !ValidNonce(strings.Repeat("Z", 64)) || !ValidNonce("") {
		t.Error("a good nonce is refused")
	}
	away, err := ThrowAway()
	if err != nil {
		t.Fatal(err)
	}
	if _, err := New(s, s, away, false); err == nil {
		t.Error("real permits by a key that is thrown away")
	}
	if _, err := New(s, s, i.Key(), true); err == nil {
		t.Error("simulated permits by the real key")
	}
	if _, err := New(s, nil, away, true); err == nil {
		t.Error("no clock")
	}
	sim, err := New(s, s, away, true)
	if err != nil {
		t.Fatal(err)
	}
	p := ask(t, sim, "")
	if !p.Simulated || p.Allows(evening) || p.State != wire.Open {
		t.Errorf("a simulated permit: %+v", p)
	}
}

func codeOf(err error) closures.ErrorCode {
	if e, ok := err.(*closures.Error); ok {
		return e.Code
	}
	return 255
}

func TestKeyFile(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, KeyFile)
	var made [4]*Key
	var wg sync.WaitGroup
	for i := range made { // whoever comes first makes it
		wg.Go(func() {
			k, err := LoadKey(dir)
			if err != nil {
				t.Error(err)
				return
			}
			made[i] = k
		})
	}
	wg.Wait()
	for _, k := range made {
		if k == nil || k.ID() != made[0].ID() {
			t.Fatal("two keys were made")
		}
	}
	if pub, err := wire.ParseJWK(made[0].JWK()); err != nil || !pub.Equal(made[0].Public()) {
		t.Errorf("JWK: %v", err)
	}
	info, err := os.Stat(path)
	if err != nil || info.Mode().Perm() != 0o600 {
		t.Fatalf("%v, mode %v", err, info.Mode())
	}
	if left, _ := filepath.Glob(filepath.Join(dir, ".*")); len(left) != 0 {
		t.Errorf("left over: %v", left)
	}
	text, _ := os.ReadFile(path)
	for name, spoil := range map[string]func(){
		"others may read": func() { _ = os.Chmod(path, 0o640) },
		"cut":             func() { _ = os.WriteFile(path, text[:len(text)/2], 0o600) },
		"empty":           func() { _ = os.WriteFile(path, nil, 0o600) },
		"two":             func() { _ = os.WriteFile(path, append(append([]byte(nil), text...), text...), 0o600) },
		"large":           func() { _ = os.WriteFile(path, make([]byte, 5000), 0o600) },
		"a folder":        func() { _ = os.Remove(path); _ = os.Mkdir(path, 0o700) },
	} {
		_ = os.Remove(path)
		if err := os.WriteFile(path, text, 0o600); err != nil {
			t.Fatal(err)
		}
		_ = os.Chmod(path, 0o600)
		spoil()
		if _, err := LoadKey(dir); err == nil || !strings.Contains(err.Error(), path) {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, err := LoadKey(filepath.Join(dir, "nowhere")); err == nil {
		t.Error("a key in a folder that is not there")
	}
}
