package feed

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"syscall"
	"testing"
	"testing/synctest"
	"time"

	"beamward/closures"
	"beamward/closures/listfile"
)

// shelf is where offered lists go.
type shelf struct {
	mu     sync.Mutex
	got    []string // authority/name=text
	answer func(name, text string) error
	during func(name string) // called in the midst of reading
}

func (s *shelf) offer(_ context.Context, a closures.AuthorityID, name string, r io.Reader) error {
	first := make([]byte, 1)
	if _, err := io.ReadFull(r, first); err != nil {
		return fmt.Errorf("read closure list: %w", err)
	}
	if s.during != nil {
		s.during(name)
	}
	rest, err := io.ReadAll(r)
	if err != nil {
		return fmt.Errorf("read closure list: %w", err)
	}
	text := string(first) + string(rest)
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.answer != nil {
		if err := s.answer(name, text); err != nil {
			return err
		}
	}
	s.got = append(s.got, fmt.Sprintf("%s/%s=%s", a, name, text))
	return nil
}

func (s *shelf) taken() []string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return slices.Clone(s.got)
}

func write(t *testing.T, path, text string) {
	t.Helper()
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

func read(t *testing.T, path string) string {
	t.Helper()
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

// looking is a folder whose looks the test makes by itself, by a clock that
// stands still in between: nothing here waits.
type looking struct {
	*Folder
	dir   string
	shelf *shelf
	told  *notices
	clock *handClock
	w     *watch
}

type handClock struct{ at time.Duration }

func (c *handClock) Wall() time.Time {
	return time.Date(2031, 2, 14, 3, 0, 0, 0, time.UTC).Add(c.at)
}
func (c *handClock) Boot() time.Duration                                { return c.at }
func (c *handClock) Timer(time.Duration) (<-chan struct{}, func() bool) { panic("nobody waits here") }

func newLooking(t *testing.T) *looking {
	t.Helper()
	l := &looking{dir: filepath.Join(t.TempDir(), "lists"), shelf: &shelf{}, told: &notices{}, clock: &handClock{}}
	if err := os.Mkdir(l.dir, 0o755); err != nil {
		t.Fatal(err)
	}
	all, err := WatchFolders([]FolderOptions{{Authority: "orbital-desk", Path: l.dir, Offer: l.shelf.offer, Clock: l.clock, Notice: l.told.tell}})
	if err != nil {
		t.Fatal(err)
	}
	l.Folder, l.w = all[0], &watch{path: l.dir, news: make(chan struct{}, 1)}
	return l
}

func (l *looking) path(name string) string { return filepath.Join(l.dir, name) }

// settle looks, lets the time to settle pass, and looks again.
func (l *looking) settle(t *testing.T) {
	t.Helper()
	l.look(t.Context(), l.w)
	l.clock.at += l.options.Settle
	l.look(t.Context(), l.w)
}

func TestListsAreTakenOnceTheySettled(t *testing.T) {
	l := newLooking(t)
	write(t, l.path("b.csv"), "two")
	if again := l.look(t.Context(), l.w); again != l.options.Settle {
		t.Errorf("looks again after %v", again)
	}
	if len(l.shelf.taken()) != 0 {
		t.Fatal("taken at first sight")
	}
	l.clock.at += l.options.Settle - 1
	write(t, l.path("b.csv"), "two, and more")
	l.look(t.Context(), l.w)
	l.clock.at += l.options.Settle - 1
	l.look(t.Context(), l.w)
	if len(l.shelf.taken()) != 0 {
		t.Fatal("taken before it settled")
	}
	l.clock.at++
	if again := l.look(t.Context(), l.w); again != l.options.Rescan {
		t.Errorf("looks again after %v", again)
	}
	want := []string{"orbital-desk/b.csv=two, and more"}
	if got := l.shelf.taken(); !slices.Equal(got, want) {
		t.Fatalf("took %q", got)
	}
	// What was taken stays, and is taken again only when its text changes.
	l.settle(t)
	if err := os.Chtimes(l.path("b.csv"), time.Time{}, time.Now().Add(time.Hour)); err != nil {
		t.Fatal(err)
	}
	l.settle(t)
	if got := l.shelf.taken(); len(got) != 1 {
		t.Fatalf("took %q", got)
	}
	write(t, l.path("b.csv"), "three")
	l.settle(t)
	if got := l.shelf.taken(); len(got) != 2 || read(t, l.path("b.csv")) != "three" {
		t.Fatalf("took %q", got)
	}
	if s := l.Stats(); s.Taken != 2 || s.Refused != 0 || s.Files != 1 || s.Waiting != 0 || s.Trouble != "" {
		t.Errorf("stats: %+v", s)
	}
}

func TestUnfinishedFilesAndFoldersAreLeftAlone(t *testing.T) {
	l := newLooking(t)
	for _, name := range []string{".hidden.yaml", "a.yaml.part", "a.yaml.tmp", "a.yaml~"} {
		write(t, l.path(name), "x")
	}
	if err := os.MkdirAll(l.path("within/deep.yaml"), 0o755); err != nil {
		t.Fatal(err)
	}
	l.settle(t)
	if err := os.Rename(l.path("a.yaml.part"), l.path("a.yaml")); err != nil {
		t.Fatal(err)
	}
	l.settle(t)
	if got := l.shelf.taken(); len(got) != 1 {
		t.Errorf("took %q", got)
	}
}

func TestARefusedFileIsMovedWithItsReason(t *testing.T) {
	l := newLooking(t)
	l.shelf.answer = func(_, text string) error {
		if text == "good" {
			return nil
		}
		return &listfile.Refusal{Total: 1500, Lines: []listfile.LineError{{Line: 3, Text: `until: 25:00`, Cause: "not a time", Mend: "write hh:mm"}, {Cause: "no windows"}}}
	}
	for i := range 3 {
		write(t, l.path("a.yaml"), fmt.Sprintf("bad %d", i))
		l.settle(t)
		l.clock.at += time.Second
	}
	write(t, l.path("b.yaml"), "good")
	l.settle(t)
	if got := l.shelf.taken(); !slices.Equal(got, []string{"orbital-desk/b.yaml=good"}) {
		t.Errorf("took %q", got)
	}
	names, err := filepath.Glob(l.path("refused/*"))
	if err != nil || len(names) != 6 {
		t.Fatalf("refused: %v, %v", names, err)
	}
	if text := read(t, l.path("refused/a.yaml")); text != "bad 0" {
		t.Errorf("moved: %q", text)
	}
	why := read(t, l.path("refused/a.yaml.txt"))
	for _, part := range []string{"a.yaml\nrefused 2031-02-14T03:00:00Z\n", "closure list refused: line 3: not a time", "line 3: not a time: write hh:mm\n    until: 25:00\n", "\nno windows\n", "and 1498 more"} {
		if !strings.Contains(why, part) {
			t.Errorf("the reason lacks %q:\n%s", part, why)
		}
	}
	if _, err := os.Stat(l.path("a.yaml")); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("it is still there: %v", err)
	}
	if s := l.Stats(); s.Refused != 3 || len(s.Refusals) != 3 || s.Refusals[0].Name != "a.yaml" || s.Trouble != "" {
		t.Errorf("stats: %+v", s)
	}
}

func TestLinksPipesAndLargeFilesAreRefusedUnread(t *testing.T) {
	l := newLooking(t)
	outside := filepath.Join(t.TempDir(), "secret.yaml")
	write(t, outside, "secret")
	if err := errors.Join(os.Symlink(outside, l.path("link.yaml")), os.Symlink("nowhere", l.path("broken.yaml")), syscall.Mkfifo(l.path("pipe.yaml"), 0o644)); err != nil {
		t.Fatal(err)
	}
	write(t, l.path("large.csv"), "")
	if err := os.Truncate(l.path("large.csv"), maxListBytes+1); err != nil {
		t.Fatal(err)
	}
	l.settle(t)
	if got := l.shelf.taken(); len(got) != 0 {
		t.Errorf("took %q", got)
	}
	for _, name := range []string{"link.yaml", "broken.yaml", "pipe.yaml", "large.csv"} {
		if _, err := os.Lstat(l.path("refused/" + name)); err != nil {
			t.Error(err)
		}
		if why := read(t, l.path("refused/"+name+".txt")); !strings.Contains(why, "it is ") {
			t.Errorf("%s: %s", name, why)
		}
	}
	if read(t, outside) != "secret" {
		t.Error("the link's target was touched")
	}
}

// A file that changes while it is read is not taken: neither its old text nor
// its new one, nor half of each.
func TestAFileThatChangesWhileItIsRead(t *testing.T) {
	for name, change := range map[string]func(t *testing.T, path string){
		"written over": func(t *testing.T, path string) { write(t, path, "new text of that length") },
		"appended to": func(t *testing.T, path string) {
			f, err := os.OpenFile(path, os.O_APPEND|os.O_WRONLY, 0)
			if err != nil {
				t.Fatal(err)
			}
			defer f.Close()
			fmt.Fprint(f, "more")
		},
		"cut": func(t *testing.T, path string) { os.Truncate(path, 3) },
		"replaced": func(t *testing.T, path string) {
			write(t, path+".part", "old text of that length")
			os.Rename(path+".part", path)
		},
		"taken away":    func(t *testing.T, path string) { os.Remove(path) },
		"made a link":   func(t *testing.T, path string) { os.Remove(path); os.Symlink("elsewhere", path) },
		"made a folder": func(t *testing.T, path string) { os.Remove(path); os.Mkdir(path, 0o755) },
	} {
		t.Run(name, func(t *testing.T) {
			l := newLooking(t)
			once := sync.OnceFunc(func() { change(t, l.path("a.yaml")) })
			l.shelf.during = func(string) { once() }
			write(t, l.path("a.yaml"), "old text of that length")
			l.settle(t)
			if got := l.shelf.taken(); len(got) != 0 {
				t.Fatalf("took %q", got)
			}
			if s := l.Stats(); s.Refused != 0 || s.Trouble == "" {
				t.Errorf("stats: %+v", s)
			}
			l.settle(t)
			l.settle(t)
			want := 1
			if name == "taken away" || strings.HasPrefix(name, "made") {
				want = 0
			}
			if got := l.shelf.taken(); len(got) != want {
				t.Fatalf("then took %q", got)
			}
		})
	}
}

// What cannot be taken now is put off, whatever it is that cannot: a full
// intake, or the service's own trouble.
func TestPutOff(t *testing.T) {
	for _, code := range []closures.ErrorCode{closures.Busy, closures.Internal} {
		l := newLooking(t)
		full := true
		l.shelf.answer = func(string, string) error {
			if full {
				return fmt.Errorf("list: %w", closures.Errorf(code, "", "not now"))
			}
			return nil
		}
		write(t, l.path("a.yaml"), "x")
		l.settle(t)
		if s := l.Stats(); s.Refused != 0 || s.Taken != 0 || s.Waiting != 1 {
			t.Errorf("stats: %+v", s)
		}
		full = false
		l.settle(t)
		if s := l.Stats(); s.Taken != 1 || s.Waiting != 0 {
			t.Errorf("stats: %+v", s)
		}
	}
}

// Lists that come together may come in any order.
func TestAListThatRestsOnAnotherThatCameWithIt(t *testing.T) {
	l := newLooking(t)
	have := map[string]bool{}
	l.shelf.answer = func(_, text string) error {
		id, rests, _ := strings.Cut(text, "<")
		if rests != "" && !have[rests] {
			return closures.Errorf(closures.NotFound, "send it first", "it replaces %s, which is not known", rests)
		}
		have[id] = true
		return nil
	}
	for _, text := range []string{"4<3", "3<2", "2<1", "1", "6<5"} {
		write(t, l.path(text[:1]+".yaml"), text)
		at := time.Date(2031, 1, 1, 0, 0, int('9'-text[0]), 0, time.UTC)
		if err := os.Chtimes(l.path(text[:1]+".yaml"), at, at); err != nil {
			t.Fatal(err)
		}
	}
	l.settle(t)
	if got := l.shelf.taken(); len(got) != 4 {
		t.Errorf("took %q", got)
	}
	if s := l.Stats(); s.Refused != 1 || s.Refusals[0].Name != "6.yaml" {
		t.Errorf("stats: %+v", s)
	}
}

func TestAFolderThatVanishesAndReturns(t *testing.T) {
	l := newLooking(t)
	write(t, l.path("a.yaml"), "x")
	l.settle(t)
	away := l.dir + ".away"
	if err := os.Rename(l.dir, away); err != nil {
		t.Fatal(err)
	}
	l.look(t.Context(), l.w)
	if s := l.Stats(); !strings.Contains(s.Trouble, "it is gone") || s.Files != 0 {
		t.Errorf("stats: %+v", s)
	}
	if err := os.Mkdir(l.dir, 0o755); err != nil {
		t.Fatal(err)
	}
	write(t, l.path("b.yaml"), "y")
	l.settle(t)
	if got := l.shelf.taken(); len(got) != 2 {
		t.Errorf("took %q", got)
	}
	if s := l.Stats(); s.Trouble != "" || s.Files != 1 {
		t.Errorf("stats: %+v", s)
	}
	if told := l.told.text(); !strings.Contains(told, "in trouble") || !strings.Contains(told, "as it should be again") {
		t.Errorf("told %s", told)
	}
}

// A refused file that cannot be moved is left, said, and not read again until
// it changes.
func TestARefusedFileThatCannotBeMoved(t *testing.T) {
	l := newLooking(t)
	l.shelf.answer = func(string, string) error { return errors.New("bad") }
	write(t, l.path("refused"), "a file in the folder's place")
	write(t, l.path("a.yaml"), "x")
	reads := 0
	l.shelf.during = func(string) { reads++ }
	l.settle(t)
	l.settle(t)
	if s := l.Stats(); reads != 2 || s.Refused != 2 || !strings.Contains(s.Trouble, "it is no folder") {
		t.Errorf("%d reads, stats: %+v", reads, s)
	}
	write(t, l.path("a.yaml"), "xy")
	l.settle(t)
	if reads != 3 {
		t.Errorf("%d reads", reads)
	}
}

func TestTwoAuthoritiesCannotHaveOneFolder(t *testing.T) {
	dir := t.TempDir()
	offer := (&shelf{}).offer
	if err := errors.Join(os.Mkdir(filepath.Join(dir, "a"), 0o755), os.Symlink("a", filepath.Join(dir, "b"))); err != nil {
		t.Fatal(err)
	}
	options := func(names ...string) (out []FolderOptions) {
		for i, n := range names {
			out = append(out, FolderOptions{Authority: closures.AuthorityID(fmt.Sprint("authority-", i)), Path: filepath.Join(dir, n), Offer: offer, Clock: &handClock{}})
		}
		return out
	}
	for _, names := range [][]string{{"a", "a"}, {"a", "a/."}, {"a", "b"}, {"b", "a"}, {"a", "x/../a"}, {"c", "c"}, {"a", "a/refused"}, {"a/refused", "a"}} {
		if _, err := WatchFolders(options(names...)); err == nil || !strings.Contains(err.Error(), "authority-0 and authority-1") {
			t.Errorf("%v: %v", names, err)
		}
	}
	if _, err := WatchFolders(options("a", "c", "a/other")); err != nil {
		t.Error(err)
	}
	// One that becomes the other's only later is not read.
	all, err := WatchFolders(options("a", "later"))
	if err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("a", filepath.Join(dir, "later")); err != nil {
		t.Fatal(err)
	}
	for _, f := range all {
		f.look(t.Context(), &watch{})
	}
	if a, b := all[0].Stats(), all[1].Stats(); a.Trouble != "" || !strings.Contains(b.Trouble, "it is the folder of authority-0") {
		t.Errorf("%+v and %+v", a, b)
	}
}

// Thousands of lists that lie there are offered after one time to settle.
func TestManyLists(t *testing.T) {
	l := newLooking(t)
	for i := range 2000 {
		write(t, l.path(fmt.Sprintf("%04d.yaml", i)), fmt.Sprint("list ", i))
	}
	began := time.Now()
	l.settle(t)
	t.Logf("2000 lists: %v besides the time to settle", time.Since(began))
	if got := l.shelf.taken(); len(got) != 2000 {
		t.Errorf("took %d", len(got))
	}
}

// The rest runs in earnest, with the file system's own news.
func TestFolderRuns(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "lists")
	s := &shelf{answer: func(_, text string) error {
		if text == "bad" {
			return errors.New("bad")
		}
		return nil
	}}
	all, err := WatchFolders([]FolderOptions{{Authority: "orbital-desk", Path: dir, Offer: s.offer, Clock: newWallClock(), Rescan: time.Hour, Settle: time.Millisecond}})
	if err != nil {
		t.Fatal(err)
	}
	f := all[0]
	ctx, cancel := context.WithCancel(t.Context())
	done := make(chan error, 1)
	go func() { done <- f.Run(ctx) }()
	defer func() {
		cancel()
		if err := <-done; err != nil {
			t.Error(err)
		}
	}()
	until(t, "it is missed", func() bool { return f.Stats().Trouble != "" })
	for round := range 2 {
		if err := os.Mkdir(dir, 0o755); err != nil {
			t.Fatal(err)
		}
		until(t, "it is found", func() bool { return f.Stats().Trouble == "" })
		write(t, filepath.Join(dir, "a.part"), fmt.Sprint("good ", round))
		if err := os.Rename(filepath.Join(dir, "a.part"), filepath.Join(dir, "a.yaml")); err != nil {
			t.Fatal(err)
		}
		until(t, "the good one is taken", func() bool { return len(s.taken()) == round+1 })
		write(t, filepath.Join(dir, "b.yaml"), "bad")
		until(t, "the bad one is refused", func() bool { return f.Stats().Refused == uint64(round+1) })
		until(t, "it is moved", func() bool { _, err := os.Stat(filepath.Join(dir, "refused/b.yaml.txt")); return err == nil })
		if err := os.RemoveAll(dir); err != nil {
			t.Fatal(err)
		}
		if round == 0 {
			write(t, filepath.Join(filepath.Dir(dir), "elsewhere"), "")
		}
	}
}

// Without the file system's news the clock alone makes it look.
func TestFolderLooksByTheClock(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		dir := t.TempDir()
		s := &shelf{}
		all, err := WatchFolders([]FolderOptions{{Authority: "orbital-desk", Path: dir, Offer: s.offer, Clock: newWallClock()}})
		if err != nil {
			t.Fatal(err)
		}
		l := all[0]
		w := &watch{path: dir, news: make(chan struct{}, 1)}
		ctx, cancel := context.WithCancel(t.Context())
		done := make(chan error, 1)
		go func() { done <- l.follow(ctx, w) }()
		synctest.Wait()
		write(t, filepath.Join(dir, "a.yaml"), "x")
		time.Sleep(l.options.Rescan + l.options.Settle)
		synctest.Wait()
		if got := s.taken(); len(got) != 1 {
			t.Errorf("took %q", got)
		}
		cancel()
		if err := <-done; err != nil {
			t.Error(err)
		}
	})
}
