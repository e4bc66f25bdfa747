package clock

import (
	"errors"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// scripted is a kernel whose samples may be loose, as when a thread is set
// aside between two reads.
type scripted struct {
	s   sample
	d   discipline
	err error
}

func (k *scripted) boot() (int64, error)    { return k.s.boot, k.err }
func (k *scripted) sample() (sample, error) { return k.s, k.err }
func (k *scripted) discipline() discipline  { return k.d }

func TestLooseSampleIsNoStep(t *testing.T) {
	k := &scripted{s: sample{wall: 1e18, boot: 1e12, mono: 1e12}}
	f, err := newFollower(k, DefaultStepLimit, 0)
	if err != nil {
		t.Fatal(err)
	}
	// The reads lie 400 ms apart and seem 300 ms wrong: nothing is proven.
	k.s.boot, k.s.mono = k.s.boot+1e9, k.s.mono+1e9
	k.s.wall += 1e9 + 3e8
	k.s.spread = 4e8
	if s := f.stateNow(); s.Step != 0 || s.Suspended != 0 {
		t.Fatalf("a loose sample was reported: %+v", s)
	}
	k.s.spread = 1e4
	if s := f.stateNow(); s.Step == 0 {
		t.Fatalf("the tight sample after it was not reported: %+v", s)
	}
}

func TestStartFailsWithoutClocks(t *testing.T) {
	gone := errors.New("gone")
	if _, err := newFollower(&scripted{err: gone}, DefaultStepLimit, 0); !errors.Is(err, gone) {
		t.Fatalf("started with %v", err)
	}
}

func TestBootGoingBackIsAFault(t *testing.T) {
	k := &scripted{s: sample{wall: 1e18, boot: 1e12, mono: 1e12}, d: discipline{known: true, synchronised: true}}
	f, err := newFollower(k, DefaultStepLimit, 0)
	if err != nil {
		t.Fatal(err)
	}
	before := f.now()
	k.s.boot -= 5e9
	after := f.now()
	if after.Boot != before.Boot || !after.Wall.Equal(before.Wall) || after.State.Fault == "" || after.State.Synchronised {
		t.Fatalf("a boot clock that went back gave %+v", after)
	}
}

// Whatever the kernel's wall clock does: without Reanchor this clock's wall
// time rises with boot time to within the slew rate, and a disagreement past
// the limit is reported.
func TestWallRisesWithBoot(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := NewVirtual(evening)
		last := v.Now()
		for range rapid.IntRange(1, 40).Draw(t, "steps") {
			switch rapid.IntRange(0, 3).Draw(t, "what") {
			case 0:
				v.Step(time.Duration(rapid.Int64Range(-3e8, 3e8).Draw(t, "step")))
			case 1:
				v.Suspend(time.Duration(rapid.Int64Range(0, 1e12).Draw(t, "suspend")))
			default:
				v.Advance(time.Duration(rapid.Int64Range(0, 1e11).Draw(t, "advance")))
			}
			now := v.Now()
			boot, wall := now.Boot-last.Boot, now.Wall.Sub(last.Wall)
			if wall < 0 || (boot > 0 && wall <= 0) {
				t.Fatalf("wall moved by %v while boot moved by %v", wall, boot)
			}
			if off := (wall - boot).Abs(); off > boot/slewDiv+1 {
				t.Fatalf("wall and boot parted by %v in %v", off, boot)
			}
			if now.State.Offset.Abs() > DefaultStepLimit && now.State.Step == 0 {
				t.Fatalf("an offset of %v is not reported", now.State.Offset)
			}
			if last.State.Step != 0 && now.State.Step == 0 {
				t.Fatal("a report went away without Reanchor")
			}
			last = now
		}
	})
}
