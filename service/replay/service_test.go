package replay_test

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"beamward/closures"
	"beamward/service"
	"beamward/service/clock"
	"beamward/service/config"
	"beamward/service/journal"
	"beamward/service/replay"
)

// What the service itself puts on record replays identically, over a restart:
// its forms are the ones that are read here.
func TestTheServicesOwnRecord(t *testing.T) {
	text, err := os.ReadFile("../../testdata/site/beamward.yaml")
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	c, err := config.Parse([]byte(strings.NewReplacer(":8460", ":0", ":8461", ":0").Replace(string(text))), dir)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.Mkdir(filepath.Join(dir, "lists"), 0o700); err != nil {
		t.Fatal(err)
	}
	v := clock.NewVirtual(evening)
	for range 2 {
		served(t, c, v)
		v.Advance(time.Minute)
	}
	r, err := journal.OpenReader(c.DataDir)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	rep, err := replay.Replay(context.Background(), r, replay.Range{}, options(r))
	if err != nil || !rep.Identical() || len(rep.Runs) != 2 || rep.Steps < 4 || rep.Compared < 2 || rep.Kept == 0 || !rep.Ended || rep.OtherBuild != 0 {
		t.Errorf("%v\n%s", err, rep.Words())
	}
}

// served runs a service for a while, which is told a few things.
func served(t *testing.T, c *config.Config, v *clock.Virtual) {
	t.Helper()
	ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
	defer cancel()
	s, err := service.New(ctx, service.Options{Config: c, Clock: v, Build: thisBuild})
	if err != nil {
		t.Fatal(err)
	}
	running, stop := context.WithCancel(ctx)
	ended := make(chan error, 1)
	go func() { ended <- s.Run(running) }()
	told := make(chan error, 1)
	go func() {
		at := v.Wall()
		_, err := s.Engine().Submit(ctx, "catwalk", closures.InterlockSeen{Source: "catwalk", Said: at, Safe: true})
		if err == nil {
			_, err = s.Engine().SubmitDurable(ctx, "console", closures.HoldPlaced{ID: closures.HoldID("h-" + s.Engine().View().BootID), Beam: "north", Reason: "a check", By: "ana", Placed: at})
		}
		told <- err
	}()
	for waiting := true; waiting; {
		v.Advance(20 * time.Millisecond)
		select {
		case err := <-told:
			if err != nil {
				t.Error(err)
			}
			waiting = false
		case <-time.After(time.Millisecond):
		}
	}
	for range 20 { // a second or two more
		v.Advance(100 * time.Millisecond)
		time.Sleep(time.Millisecond)
	}
	stop()
	if err := <-ended; err != nil {
		t.Error(err)
	}
	if err := s.Close(); err != nil {
		t.Error(err)
	}
}
