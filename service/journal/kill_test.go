package journal

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"math/rand"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// The test binary starts itself again with childEnv set to what the child is
// to do in the folder named by childDir.
const (
	childEnv = "BEAMWARD_JOURNAL_CHILD"
	childDir = "BEAMWARD_JOURNAL_DIR"
)

func child() int {
	do := map[string]func(dir string) error{"write": childWrites, "read-only": childReadOnly}[os.Getenv(childEnv)]
	if do == nil {
		return 2
	}
	if err := do(os.Getenv(childDir)); err != nil {
		fmt.Println("error:", err)
		return 1
	}
	return 0
}

// numbered is the one entry that may stand under its number.
func numbered(seq uint64) Entry {
	kind := "aim"
	switch {
	case seq%500 == 0:
		kind = KindDurable
	case seq%7 == 0:
		kind = "hold"
	}
	return Entry{
		Seq: seq, At: evening.Add(time.Duration(seq) * time.Millisecond), Kind: kind, Urgent: kind == "hold",
		Body: fmt.Appendf(nil, `{"n":%d,"pad":"%s"}`, seq, strings.Repeat("x", int(seq%50))),
	}
}

// childWrites appends until it is killed, and says on stdout what is durable.
func childWrites(dir string) error {
	j, err := Open(Options{Dir: dir, Clock: machineClock{time.Now()}, BlockAge: 2 * time.Millisecond})
	if err != nil {
		return err
	}
	news := make(chan struct{}, 1)
	j.Notify(news)
	go func() {
		for range news {
			fmt.Println(j.State().Durable)
		}
	}()
	go func() { _ = j.Run(context.Background()) }()
	random := rand.New(rand.NewSource(time.Now().UnixNano()))
	for seq := j.State().Queued + 1; ; {
		var es []Entry
		for range 1 + random.Intn(20) {
			es = append(es, numbered(seq))
			seq++
		}
		text, err := Pack(fmt.Sprint("list-", seq/100), fmt.Appendf(nil, "list %d", seq/100))
		if err != nil {
			return err
		}
		if err := j.Append(es, text); err != nil {
			return err
		}
		if seq > 300 {
			if err := j.Wait(context.Background(), seq-300); err != nil {
				return err
			}
		}
	}
}

// A writer killed at any moment has on record what it said to be durable, and
// the chain holds. The long variant takes 1,000 kills.
func TestKilledWriterKeepsItsWord(t *testing.T) {
	rounds := 24 / min(thin, 3)
	if os.Getenv("BEAMWARD_LONG") == "1" {
		rounds = 1000
	}
	dir := place(t)
	random := rand.New(rand.NewSource(time.Now().UnixNano()))
	acknowledged, total := uint64(0), uint64(0)
	for round := range rounds {
		said, err := killedAfter(dir, time.Duration(random.Intn(30_000))*time.Microsecond)
		must(t, err)
		acknowledged = max(acknowledged, said)
		if round%12 == 11 { // not to read an ever longer record
			checkWord(t, dir, acknowledged)
			must(t, os.RemoveAll(dir))
			acknowledged, total = 0, total+acknowledged
			continue
		}
		checkWord(t, dir, acknowledged)
	}
	t.Logf("%d kills, %d entries called durable", rounds, total)
}

func checkWord(t *testing.T, dir string, acknowledged uint64) {
	t.Helper()
	j, err := Open(Options{Dir: dir, Clock: newHandClock()})
	must(t, err)
	defer j.Close()
	s := j.State()
	if s.Durable < acknowledged || !s.Sound || j.Cut() != nil {
		t.Fatalf("acknowledged %d, found %+v, cut %v", acknowledged, s, j.Cut())
	}
	ctx := context.Background()
	if rep, err := j.Verify(ctx, nil); err != nil || rep.Damage != nil || rep.Last != s.Durable {
		t.Fatalf("verify: %+v %v", rep, err)
	}
	want := uint64(0)
	must(t, j.Read(ctx, Query{}, func(e Entry) error {
		want++
		w := numbered(want)
		if e.Seq != w.Seq || e.Kind != w.Kind || string(e.Body) != string(w.Body) || !e.At.Equal(w.At) {
			t.Fatalf("entry %d is %+v", want, e)
		}
		return nil
	}))
	if want != s.Durable {
		t.Fatalf("%d entries, %d durable", want, s.Durable)
	}
}

// killedAfter starts a writer, lets it go on for a while after its first word,
// kills it and returns the highest number that it called durable.
func killedAfter(dir string, d time.Duration) (uint64, error) {
	cmd := exec.Command(os.Args[0])
	cmd.Env = append(os.Environ(), childEnv+"=write", childDir+"="+dir)
	out, err := cmd.StdoutPipe()
	if err != nil {
		return 0, err
	}
	if err := cmd.Start(); err != nil {
		return 0, err
	}
	defer func() { _ = cmd.Wait() }()
	said := uint64(0)
	var timer *time.Timer
	lines := bufio.NewReader(out)
	for {
		line, err := lines.ReadString('\n')
		if err != nil {
			break // a last line that is not whole was not said
		}
		n, err := strconv.ParseUint(strings.TrimSpace(line), 10, 64)
		if err != nil {
			_ = cmd.Process.Kill()
			return 0, fmt.Errorf("the writer said %q", line)
		}
		said = max(said, n)
		if timer == nil {
			timer = time.AfterFunc(d, func() { _ = cmd.Process.Kill() })
			defer timer.Stop()
		}
	}
	return said, nil
}

// nobody is the customary number of a user without rights.
const nobody = 65534

// childReadOnly gives up its rights and looks at a record that it may only
// read.
func childReadOnly(dir string) error {
	if os.Getuid() == 0 {
		if err := errors.Join(syscall.Setgid(nobody), syscall.Setuid(nobody)); err != nil {
			return err
		}
	}
	if j, err := Open(Options{Dir: dir, Clock: newHandClock()}); err == nil {
		_ = j.Close()
		return errors.New("opened for writing")
	} else if !strings.Contains(err.Error(), "writable") {
		return fmt.Errorf("refused without the mend: %w", err)
	}
	r, err := OpenReader(dir)
	if err != nil {
		return err
	}
	defer r.Close()
	rep, err := r.Verify(context.Background(), nil)
	if err != nil {
		return err
	}
	if rep.Damage != nil || rep.Entries != 24 {
		return fmt.Errorf("verified as %+v", rep)
	}
	return nil
}

func TestReadOnlyFolder(t *testing.T) {
	dir, _ := small(t)
	open, err := os.MkdirTemp("", "beamward")
	must(t, err)
	t.Cleanup(func() {
		_ = filepath.WalkDir(open, func(path string, _ fs.DirEntry, _ error) error { return os.Chmod(path, 0o700) })
		_ = os.RemoveAll(open)
	})
	must(t, os.Chmod(open, 0o755))
	moved := filepath.Join(open, "var")
	must(t, os.Rename(dir, moved))
	must(t, os.Remove(filepath.Join(moved, lockFile)))
	for _, x := range []struct {
		path string
		mode fs.FileMode
	}{{filepath.Join(moved, File), 0o400}, {moved, 0o500}} {
		if os.Getuid() == 0 {
			must(t, os.Chown(x.path, nobody, nobody))
		}
		must(t, os.Chmod(x.path, x.mode))
	}
	cmd := exec.Command(os.Args[0])
	cmd.Env = append(os.Environ(), childEnv+"=read-only", childDir+"="+moved)
	if out, err := cmd.CombinedOutput(); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
}
