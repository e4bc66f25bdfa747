package service_test

import (
	"bytes"
	"strings"
	"testing"
	"time"

	"beamward/service/config"
)

// A reload that only closes takes effect at once; one that loosens, or changes
// what was bound at the start, changes nothing and says what to do.
func TestReload(t *testing.T) {
	dir := t.TempDir()
	x := start(t, dir, evening, nil)
	x.step(200 * time.Millisecond)
	edited := func(from, to string) *config.Config {
		t.Helper()
		text := example(t)
		if !bytes.Contains(text, []byte(from)) {
			t.Fatalf("the example has no %q", from)
		}
		c, err := config.Parse(bytes.Replace(text, []byte(from), []byte(to), 1), dir)
		if err != nil {
			t.Fatal(err)
		}
		return c
	}
	before := x.s.Engine().View().Rules.Digest
	for _, c := range []struct{ from, to, want string }{
		{"elevation_min_deg: 30", "elevation_min_deg: 20", "limits.elevation_min_deg"},
		{"lead: 5s", "lead: 1s", "authorities[orbital-desk].lead"},
		{"data_dir: var", "data_dir: elsewhere", "data_dir"},
	} {
		err := x.s.Reload(t.Context(), edited(c.from, c.to), "ana")
		if err == nil || !strings.Contains(err.Error(), c.want) || !strings.Contains(err.Error(), "restart") {
			t.Errorf("%s: %v", c.to, err)
		}
		if x.s.Engine().View().Rules.Digest != before {
			t.Fatalf("%s: the rules changed", c.to)
		}
	}
	if err := x.s.Reload(t.Context(), edited("elevation_min_deg: 30", "elevation_min_deg: 50"), "ana"); err != nil {
		t.Fatal(err)
	}
	if got := x.s.Engine().View().Rules.Beams[0].Limits.ElevationMin.Degrees(); got < 49 {
		t.Errorf("the limit is %v", got)
	}
}
