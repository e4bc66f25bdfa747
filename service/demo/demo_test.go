package demo

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"go.uber.org/goleak"

	"beamward/closures"
	"beamward/service/config"
	"beamward/service/permit"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// The whole night shows every reason and leaves a record that verifies; Run
// fails otherwise. Every permit that a laser reads says simulated inside its
// signature, and the key is kept nowhere (BW-031).
func TestTheWholeNight(t *testing.T) {
	dir := t.TempDir()
	var out bytes.Buffer
	err := Run(t.Context(), Options{Out: &out, Dir: dir, JSON: true})
	if err != nil {
		t.Fatalf("%v\n%s", err, out.Bytes())
	}
	if _, err := os.Stat(filepath.Join(dir, "var", permit.KeyFile)); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("the key of simulated permits is kept: %v", err)
	}
	type line struct {
		S       float64  `json:"t_s"`
		Beam    string   `json:"beam"`
		State   string   `json:"state"`
		Codes   []string `json:"codes"`
		Permits int      `json:"permits_read"`
	}
	opened := map[string]bool{}
	listed := 0.0
	var last line
	for _, text := range bytes.Split(bytes.TrimSpace(out.Bytes()), []byte{'\n'}) {
		last = line{}
		if err := json.Unmarshal(text, &last); err != nil {
			t.Fatalf("%v: %s", err, text)
		}
		if last.State == "open" {
			opened[last.Beam] = true
		}
		if last.Beam == "north" && opened["north"] && listed == 0 && strings.Contains(strings.Join(last.Codes, " "), "listed-closure") {
			listed = last.S
		}
	}
	if !opened["north"] || !opened["south"] {
		t.Errorf("opened were %v", opened)
	}
	if last.Permits < 400 {
		t.Errorf("only %d permits were read", last.Permits)
	}
	// The window begins at 20 s: permits end by its lead of 2 s, the shutter's
	// 0.5 s and the readers' 0.2 s before, and the next decision, a step later at
	// most, is shuttered.
	if end := 20 - 2 - 0.5 - 0.2; !(listed > end-1 && listed <= end+0.11) {
		t.Errorf("the listed window from 20 s shuttered at %v s", listed)
	}
}

// A night that ends early says what it did not show, and its record verifies.
func TestPartOfTheNight(t *testing.T) {
	var out bytes.Buffer
	err := Run(t.Context(), Options{Out: &out, Dir: t.TempDir(), For: 9 * time.Second})
	if err == nil || !strings.Contains(err.Error(), "did not show listed-closure, aircraft") {
		t.Errorf("it ended with %v", err)
	}
	for _, want := range []string{"north, south  SHUTTERED", "OPEN", "not shown", "The record verifies", "record verify --config"} {
		if !strings.Contains(out.String(), want) {
			t.Errorf("%q was not told:\n%s", want, out.String())
		}
	}
}

// A night that is called off ends at once, with everything given back.
func TestCalledOff(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	var out callingOff
	out.cancel = cancel
	if err := Run(ctx, Options{Out: &out, Dir: t.TempDir()}); !errors.Is(err, context.Canceled) {
		t.Errorf("it ended with %v", err)
	}
}

// callingOff cancels when something is told.
type callingOff struct {
	cancel func()
}

func (w *callingOff) Write(p []byte) (int, error) {
	if bytes.Contains(p, []byte("begin to speak")) {
		w.cancel()
	}
	return len(p), nil
}

// What is not empty is left alone.
func TestFolderInUse(t *testing.T) {
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "mine"), nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := Run(t.Context(), Options{Out: &bytes.Buffer{}, Dir: dir}); err == nil || !strings.Contains(err.Error(), "is not empty") {
		t.Errorf("it ended with %v", err)
	}
}

// The config that the demo writes is one that a site could write.
func TestSite(t *testing.T) {
	c, err := config.Parse([]byte(siteText("127.0.0.1:0")), "/")
	if err != nil {
		t.Fatal(err)
	}
	if len(c.Feeds) != numFeeds {
		t.Errorf("it has %d feeds", len(c.Feeds))
	}
	if c.Rules.Site.Position != skerry {
		t.Errorf("the site stands at %v, not %v", c.Rules.Site.Position, skerry)
	}
	for i := range c.Rules.Beams {
		if c.Rules.Beams[i].Limits.SunBelow != sunLimit {
			t.Errorf("beam %s has another limit of the Sun", c.Rules.Beams[i].ID)
		}
	}
}

// The story is in order and fits its length; the aircraft fly as the site's
// bounds allow.
func TestStory(t *testing.T) {
	for i := 1; i < len(story); i++ {
		if story[i].at < story[i-1].at {
			t.Errorf("cue %d at %v comes before %v", i, story[i].at, story[i-1].at)
		}
	}
	if last := story[len(story)-1].at; last >= storyLength {
		t.Errorf("the last cue at %v is after the end", last)
	}
	for _, f := range flights {
		before, track := f.where(0)
		for at := 100 * time.Millisecond; at < storyLength; at += 100 * time.Millisecond {
			now, heading := f.where(at)
			if flown := now.Sub(before).Norm(); flown > f.speed*0.1*1.001 || flown < f.speed*0.1*0.99 {
				t.Fatalf("aircraft %s flew %v m in 0.1 s at %v", f.address, flown, at)
			}
			const degree = 0.017453292519943295
			if a := f.speed * (heading - track) * degree / 0.1; a > 22 || a < -22 {
				t.Fatalf("aircraft %s turned with %v m/s² at %v", f.address, a, at)
			}
			before, track = now, heading
		}
	}
}

// A teller says what is missing until it was shown where it counts.
func TestTellerCounts(t *testing.T) {
	tell := newTeller(&bytes.Buffer{}, false)
	d := closures.Decision{Beam: "north", Codes: closures.Codes(0).With(closures.CodeHold).With(closures.CodeStarting)}
	tell.note(0, &d)
	missing := strings.Join(tell.missing(), " ")
	if !strings.Contains(missing, "hold") || strings.Contains(missing, "starting") {
		t.Errorf("before the first opening missing are %s", missing)
	}
	tell.opens++
	tell.note(time.Second, &d)
	if missing = strings.Join(tell.missing(), " "); strings.Contains(missing, "hold") {
		t.Errorf("after it missing are %s", missing)
	}
}
