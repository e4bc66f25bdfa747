package simulate

import (
	"strings"
	"testing"
	"time"
)

// The judge has teeth: what is broken on purpose it finds, and calls by its
// name. BW-005 and BW-012 are among what is broken.
func TestTheJudgeFindsWhatIsBroken(t *testing.T) {
	for _, c := range []struct {
		broken Fault
		name   string
		what   string
	}{
		{FaultIgnoreUntil, "a reader ignores valid_until", "the permit ran out"},
		{FaultNoLead, "a list's lead is ignored", "list "},
		{FaultNoWarmUp, "a receiver is believed at once", "rx-1 not warm"},
		{FaultForget, "a restart forgets", "hold "},
		{FaultSafe, "an interlock that always says safe", "people in danger"},
		{FaultLate, "aircraft are told late as if they were fresh", "aircraft"},
	} {
		t.Run(c.name, func(t *testing.T) {
			t.Parallel()
			const most = 12
			for i := range uint64(most) {
				seed := (i + 7) % most // a good one comes first
				r := played(t, Options{Seed: seed + 1, Length: 15 * time.Minute, Dir: folder(t), Broken: c.broken})
				for i := range r.Unsafe {
					if strings.Contains(r.Unsafe[i].What, c.what) {
						t.Logf("seed %d: found after %v: %s", r.Seed, r.Unsafe[i].At.Sub(r.Start), r.Unsafe[i].What)
						return
					}
				}
			}
			t.Errorf("in %d nights the judge found nothing", most)
		})
	}
}
