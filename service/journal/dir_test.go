package journal

import (
	"context"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func TestModesAreNarrow(t *testing.T) {
	dir := place(t)
	j := mustOpen(t, Options{Dir: dir})
	must(t, j.Append(entries(1, 1, "aim")))
	must(t, j.Flush(context.Background()))
	files := 0
	must(t, filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		must(t, err)
		info, err := d.Info()
		must(t, err)
		want := fs.FileMode(0o600)
		if d.IsDir() {
			want = 0o700
		}
		if info.Mode().Perm() != want {
			t.Errorf("%s has mode %04o, want %04o", path, info.Mode().Perm(), want)
		}
		files++
		return nil
	}))
	if files != 5 { // the folder, record.db, -wal, -shm, record.lock
		t.Errorf("%d files, want 5", files)
	}
}

func TestOpenRefuses(t *testing.T) {
	clk := newHandClock()
	if _, err := Open(Options{Dir: place(t)}); err == nil {
		t.Error("without a clock: opened")
	}
	if _, err := Open(Options{Clock: clk}); err == nil {
		t.Error("without a folder: opened")
	}
	if _, err := Open(Options{Dir: place(t), Clock: clk, Capacity: 10, Reserve: 9}); err == nil {
		t.Error("a reserve that leaves no room: opened")
	}
	for name, prepare := range map[string]func(dir string){
		"chmod 700": func(dir string) { must(t, os.Mkdir(dir, 0o755)) },
		"this user can write": func(dir string) {
			must(t, os.WriteFile(dir, nil, 0o600))
		},
		"not a plain file": func(dir string) {
			must(t, os.Mkdir(dir, 0o700))
			must(t, os.Symlink("elsewhere", filepath.Join(dir, File)))
		},
	} {
		dir := place(t)
		prepare(dir)
		if _, err := Open(Options{Dir: dir, Clock: clk}); err == nil || !strings.Contains(err.Error(), name) {
			t.Errorf("want %q in the error, got %v", name, err)
		}
	}
}

func TestOddPath(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "a b?c=d&e#f%20é;'")
	j := mustOpen(t, Options{Dir: dir})
	must(t, j.Append(entries(1, 3, "aim")))
	must(t, j.Flush(context.Background()))
	must(t, j.Backup(context.Background(), filepath.Join(dir, "copy 'of' it?.db")))
	must(t, j.Close())
	if _, err := os.Stat(filepath.Join(dir, File)); err != nil {
		t.Fatal(err)
	}
	if rep := verify(t, dir); rep.Last != 3 || rep.Damage != nil {
		t.Fatalf("%+v", rep)
	}
}

func TestTwoOpeners(t *testing.T) {
	dir, all := small(t)
	j := mustOpen(t, Options{Dir: dir})
	if _, err := Open(Options{Dir: dir, Clock: newHandClock()}); err == nil || !strings.Contains(err.Error(), "in use by process") {
		t.Fatalf("a second opener: %v", err)
	}
	// Readers may look on, and see what is written meanwhile.
	r, err := OpenReader(dir)
	must(t, err)
	defer r.Close()
	same(t, readAll(t, r, Query{}), all)
	must(t, j.Append(entries(25, 25, "aim")))
	must(t, j.Flush(context.Background()))
	if e, ok, err := r.Last(context.Background()); err != nil || !ok || e.Seq != 25 {
		t.Fatalf("seen by a reader: %v %v %v", e, ok, err)
	}
	must(t, j.Close())
	mustOpen(t, Options{Dir: dir})
}

func TestOpenReaderNeedsARecord(t *testing.T) {
	if _, err := OpenReader(place(t)); err == nil {
		t.Error("read a folder that is not there")
	}
	dir := t.TempDir()
	must(t, os.WriteFile(filepath.Join(dir, File), nil, 0o600))
	if _, err := OpenReader(dir); err == nil {
		t.Error("read an empty file")
	}
}
