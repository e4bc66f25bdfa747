package feed

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"testing/synctest"
	"time"

	"beamward/closures"
)

// followed is a file whose looks the test makes by itself.
type followed struct {
	*follower
	got   []string
	begun int
	clock *handClock
}

func newFollowed(t *testing.T) *followed {
	t.Helper()
	clock := &handClock{}
	d, err := newDesk(Options{Bound: []Bound{{Name: "rx-1", Aircraft: true}}, Intake: newInbox().take, Clock: clock})
	if err != nil {
		t.Fatal(err)
	}
	f := &followed{clock: clock}
	f.follower = &follower{path: filepath.Join(t.TempDir(), "facts"), clock: clock, desk: d, begin: func() { f.begun++ },
		line: func(text []byte, long bool) error {
			if long {
				text = []byte("long")
			}
			f.got = append(f.got, string(text))
			return nil
		}}
	t.Cleanup(f.close)
	return f
}

func (f *followed) see(t *testing.T) string {
	t.Helper()
	if err := f.look(t.Context()); err != nil {
		t.Fatal(err)
	}
	f.started = true
	out := strings.Join(f.got, " ")
	f.got = nil
	return out
}

func add(t *testing.T, path, text string) {
	t.Helper()
	f, err := os.OpenFile(path, os.O_APPEND|os.O_CREATE|os.O_WRONLY, 0o644)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if _, err := f.WriteString(text); err != nil {
		t.Fatal(err)
	}
}

func TestFollowingAFile(t *testing.T) {
	f := newFollowed(t)
	add(t, f.path, "past\npa")
	want := func(what, want string, begun int) {
		t.Helper()
		if got := f.see(t); got != want || f.begun != begun {
			t.Fatalf("%s: %q, begun %d times; want %q and %d", what, got, f.begun, want, begun)
		}
	}
	want("what is there at the start is past", "", 1)
	add(t, f.path, "st\none\r\ntwo\nthr")
	want("appended to", "st one two", 1)
	add(t, f.path, "ee\n")
	want("a line's end comes later", "three", 1)
	add(t, f.path, "four\nunfin")
	if err := os.Rename(f.path, f.path+".1"); err != nil {
		t.Fatal(err)
	}
	want("renamed away, with a rest", "four", 1)
	if f.desk.Stats().Trouble == "" {
		t.Error("that it is away is not said")
	}
	add(t, f.path+".1", "ished\n")
	add(t, f.path, "five\n")
	want("made anew, when the old one got its end", "unfinished five", 2)
	if s := f.desk.Stats(); s.Trouble != "" || s.Open != 1 || s.Connections != 2 {
		t.Errorf("%+v", s)
	}
	add(t, f.path, "six\nsev")
	want("appended to", "six", 2)
	if err := os.WriteFile(f.path, []byte("8\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	want("cut and written anew", "8", 3)
	if err := os.Truncate(f.path, 0); err != nil {
		t.Fatal(err)
	}
	want("cut", "", 4)
	add(t, f.path, "nine\n")
	want("appended to", "nine", 4)
	add(t, f.path, "ten\n")
	write(t, f.path+".new", "eleven\n")
	if err := os.Rename(f.path+".new", f.path); err != nil {
		t.Fatal(err)
	}
	want("replaced, with a rest", "ten eleven", 5)
	os.Remove(f.path)
	want("removed", "", 5)
	add(t, f.path, strings.Repeat("x", 200000)+"\ntwelve\n")
	want("a line too long", "long twelve", 6)
}

// What was written while nobody looked is passed over, where its time would
// be that of its reading.
func TestFollowingPassesOverWhatIsLate(t *testing.T) {
	f := newFollowed(t)
	f.skip = time.Second
	add(t, f.path, "")
	f.see(t)
	f.clock.at += time.Second
	add(t, f.path, "one\n")
	if got := f.see(t); got != "one" {
		t.Errorf("%q", got)
	}
	f.clock.at += time.Second + 1
	add(t, f.path, "two\nth")
	if got := f.see(t); got != "" || f.begun != 2 {
		t.Errorf("%q, begun %d times", got, f.begun)
	}
	add(t, f.path, "ree\nfour\n")
	if got := f.see(t); got != "ree four" {
		t.Errorf("%q", got)
	}
}

func TestFollowingWhatIsNoFile(t *testing.T) {
	f := newFollowed(t)
	if got := f.see(t); got != "" || f.desk.Stats().Trouble == "" {
		t.Error("a missing file is not said")
	}
	if err := syscall.Mkfifo(f.path, 0o644); err != nil {
		t.Fatal(err)
	}
	f.see(t)
	if s := f.desk.Stats(); !strings.Contains(s.Trouble, "no plain file") {
		t.Errorf("%+v", s)
	}
	os.Remove(f.path)
	os.Mkdir(f.path, 0o755)
	f.see(t)
	if s := f.desk.Stats(); !strings.Contains(s.Trouble, "no plain file") {
		t.Errorf("%+v", s)
	}
	os.Remove(f.path)
	add(t, f.path, "one\n")
	if got := f.see(t); got != "one" {
		t.Errorf("%q", got)
	}
}

func TestFactsFromAFile(t *testing.T) {
	in := newInbox()
	path := filepath.Join(t.TempDir(), "facts.ndjson")
	add(t, path, interlockLine("catwalk")+"\n")
	f, err := FollowFile(FileOptions{Options: Options{Bound: []Bound{{Name: "catwalk"}, {Name: "rx-1", Aircraft: true}}, Intake: in.take, Clock: newWallClock()}, Path: path})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- f.Run(ctx) }()
	defer func() {
		cancel()
		if err := <-done; err != nil {
			t.Error(err)
		}
	}()
	until(t, "it is open", func() bool { return f.Stats().Open == 1 })
	in.answer(errFull, 2)
	add(t, path, aircraftLine("rx-1", "a1b2c3")+"\nnonsense\n"+interlockLine("catwalk")+"\n"+interlockLine("hatch")+"\n")
	if h, ok := in.next(t).body.(closures.Heard); !ok || !h.Connected {
		t.Errorf("%+v", h)
	}
	if _, ok := in.next(t).body.(closures.AircraftSeen); !ok {
		t.Error("no aircraft")
	}
	if _, ok := in.next(t).body.(closures.InterlockSeen); !ok {
		t.Error("no interlock")
	}
	until(t, "two are refused", func() bool { return f.Stats().Refused == 2 })
	in.none(t)
}

// Without the file system's news the clock alone makes it look.
func TestFollowingByTheClock(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		f := newFollowed(t)
		f.follower.clock = newWallClock()
		add(t, f.path, "")
		ctx, cancel := context.WithCancel(t.Context())
		done := make(chan error, 1)
		go func() { done <- f.follow(ctx, &watch{path: filepath.Dir(f.path)}) }()
		synctest.Wait()
		add(t, f.path, "one\n")
		time.Sleep(followEvery)
		synctest.Wait()
		if strings.Join(f.got, " ") != "one" {
			t.Errorf("%q", f.got)
		}
		cancel()
		<-done
	})
}
