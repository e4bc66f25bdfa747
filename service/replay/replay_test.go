package replay_test

import (
	"context"
	"testing"
	"time"

	"go.uber.org/goleak"

	"beamward/service/journal"
	"beamward/service/replay"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

func options(r *journal.Reader) replay.Options {
	return replay.Options{Texts: textsOf(r), Build: thisBuild}
}

// whole replays everything on record.
func (w *world) whole() replay.Report {
	w.t.Helper()
	rep, err := replay.Replay(context.Background(), w.j.Reader, replay.Range{}, options(w.j.Reader))
	w.must(err)
	return rep
}

// identical asks for a replay without a difference.
func (w *world) identical() replay.Report {
	w.t.Helper()
	rep := w.whole()
	for i := range rep.Differences {
		w.t.Error(rep.Differences[i].String())
	}
	if !rep.Identical() {
		w.t.Fatalf("the replay is not identical: %+v", rep)
	}
	return rep
}

// Random nights replay identically, through restarts, kills, steps of the
// clock, reloads, lost entries and a stalled store.
func TestRandomNightsReplayIdentically(t *testing.T) {
	var all replay.Report
	seeds := uint64(4)
	if raceOn {
		seeds = 1
	}
	for seed := range seeds {
		w := newWorld(t, seed, siteText(t))
		w.opened()
		w.calm(6 * time.Second)
		w.wander(40*time.Second, 4)
		w.stop()
		w.start()
		w.calm(4 * time.Second)
		w.wander(70*time.Second, 12)
		w.kill()
		w.small = seed%2 == 1
		w.start()
		w.wander(20*time.Second, 1)
		w.calm(6 * time.Second)
		rep := w.identical()
		t.Logf("seed %d: %d entries, %d runs, %d steps, %d decisions, %d compared, %d granted, %d tallies, %d kept, %d unapplied, %d skipped, %d gaps of %d entries",
			seed, rep.Entries, len(rep.Runs), rep.Steps, rep.Decisions, rep.Compared, rep.Granted, rep.Tallies, rep.Kept, rep.Unapplied, rep.Skipped, rep.GapCount, rep.LostEntries)
		all.Granted += rep.Granted
		all.Tallies += rep.Tallies
		all.GapCount += rep.GapCount
	}
	if !raceOn && (all.Granted == 0 || all.Tallies == 0 || all.GapCount == 0) {
		t.Errorf("the nights show too little: %d granted, %d tallies, %d gaps", all.Granted, all.Tallies, all.GapCount)
	}
}
