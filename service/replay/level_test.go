package replay_test

import (
	"context"
	"os"
	"os/exec"
	"runtime"
	"strings"
	"testing"
	"time"

	"golang.org/x/sys/cpu"

	"beamward/service/journal"
	"beamward/service/replay"
)

// recordEnv names the folder of a record that a child of this test replays.
const recordEnv = "BEAMWARD_REPLAY_RECORD"

// A build for GOAMD64=v3 fuses multiplications with additions, which rounds
// otherwise. What one for v1 recorded, it replays without a difference that is
// not listed.
func TestOtherLevel(t *testing.T) {
	if dir := os.Getenv(recordEnv); dir != "" {
		replayOther(t, dir)
		return
	}
	if os.Getenv("BEAMWARD_LONG") == "" {
		t.Skip("BEAMWARD_LONG is not set: this builds the test once more")
	}
	if x := cpu.X86; runtime.GOARCH != "amd64" || !x.HasFMA || !x.HasAVX2 || !x.HasBMI2 {
		t.Skip("this machine does not run GOAMD64=v3")
	}
	w := newWorld(t, 31, siteText(t))
	w.opened()
	w.calm(6 * time.Second)
	w.wander(4*time.Minute, 6)
	w.calm(2 * time.Minute)
	w.identical()
	w.stop()
	child := exec.Command("go", "test", "-count=1", "-v", "-run", "^TestOtherLevel$", ".")
	child.Env = append(os.Environ(), recordEnv+"="+w.dir, "GOAMD64=v3")
	out, err := child.CombinedOutput()
	t.Logf("%s", out)
	if err != nil || !strings.Contains(string(out), "PASS: TestOtherLevel") {
		t.Error(err)
	}
}

func replayOther(t *testing.T, dir string) {
	r, err := journal.OpenReader(dir)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	opt := options(r)
	opt.Build = "beamward test of another level"
	rep, err := replay.Replay(context.Background(), r, replay.Range{}, opt)
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("%d entries, %d decisions, %d compared: %d rounded otherwise, %d close, %d different", rep.Entries, rep.Decisions, rep.Compared, rep.Rounded, rep.Close, rep.Different)
	for _, c := range rep.Calls {
		t.Logf("close: %+v", c)
	}
	for i := range rep.Differences {
		t.Error(rep.Differences[i].String())
	}
}
