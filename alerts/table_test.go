package alerts

import (
	"slices"
	"strings"
	"testing"
	"time"
)

func lines(s string) (out [][]string) {
	for _, l := range strings.Split(strings.TrimSpace(s), "\n") {
		out = append(out, strings.Fields(l))
	}
	return out
}

// The table is whole: at most 30 alarms, each with its texts and times, no
// parent that is not there or in a ring, no safety alarm that a lesser one hides.
func TestTable(t *testing.T) {
	all := Rows()
	if len(all) > 30 {
		t.Errorf("%d alarms", len(all))
	}
	if all[0].Kind != ShutterFault || all[0].Priority != High {
		t.Error("shutter-fault is not first of all")
	}
	var seen []Kind
	for i, r := range all {
		if slices.Contains(seen, r.Kind) {
			t.Errorf("%s is there twice", r.Kind)
		}
		seen = append(seen, r.Kind)
		for _, text := range []string{r.Cause, r.Consequence, r.Do} {
			if len(text) < 10 || !strings.HasSuffix(text, ".") || text != clean(text, 300) {
				t.Errorf("%s: text %q", r.Kind, text)
			}
		}
		if r.Respond <= 0 || r.On < 0 || r.Off < leastOff || r.Priority == NoPriority {
			t.Errorf("%s: %+v", r.Kind, r)
		}
		if r.Safety && r.On > time.Minute {
			t.Errorf("%s: a safety alarm waits for %v", r.Kind, r.On)
		}
		if i > 0 && r.Priority > all[i-1].Priority {
			t.Errorf("%s comes after what asks less", r.Kind)
		}
		for _, p := range r.Parents {
			o, ok := RowOf(p)
			if !ok {
				t.Errorf("%s: its parent %s is no alarm", r.Kind, p)
			}
			if r.Safety && !o.Safety || o.Priority < r.Priority {
				t.Errorf("%s: %s hides it and asks less", r.Kind, p)
			}
			if r.Always && !o.Always {
				t.Errorf("%s: %s hides it and is itself quiet by day", r.Kind, p)
			}
			if rank(p) > i {
				t.Errorf("%s: its parent %s comes later", r.Kind, p) // so no ring
			}
		}
	}
	if _, ok := RowOf("closes-soon"); ok {
		t.Error("a notice is an alarm")
	}
}
