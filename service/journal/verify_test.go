package journal

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"math/rand"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// small writes a record of several blocks with a text and two durable entries,
// closes it, and gives its folder and entries.
func small(t testing.TB) (string, []Entry) {
	t.Helper()
	dir := place(t)
	j := mustOpen(t, Options{Dir: dir})
	ctx := context.Background()
	var all []Entry
	for n := range uint64(6) {
		es := entries(n*4+1, n*4+3, "aim")
		kind := "hold"
		if n == 1 || n == 4 {
			kind = KindDurable
		}
		es = append(es, entry(n*4+4, kind))
		b, err := Pack(fmt.Sprint("sha256:", n/2), []byte(strings.Repeat("a list ", int(n/2)+1)))
		must(t, err)
		must(t, j.Append(es, b))
		must(t, j.Flush(ctx))
		all = append(all, es...)
	}
	must(t, j.Close())
	return dir, all
}

// surgery opens the file behind the journal's back.
func surgery(t testing.TB, dir string) *sql.DB {
	t.Helper()
	db, err := sql.Open("sqlite", dsn(filepath.Join(dir, File), "rw", "synchronous(OFF)"))
	must(t, err)
	db.SetMaxOpenConns(1)
	t.Cleanup(func() { _ = db.Close() })
	return db
}

func alter(t testing.TB, db *sql.DB, query string, args ...any) {
	t.Helper()
	if _, err := db.Exec(query, args...); err != nil {
		t.Fatalf("%s: %v", query, err)
	}
}

func verify(t testing.TB, dir string) Report {
	t.Helper()
	r, err := OpenReader(dir)
	must(t, err)
	defer r.Close()
	rep, err := r.Verify(context.Background(), nil)
	must(t, err)
	return rep
}

func TestVerifyReports(t *testing.T) {
	dir, all := small(t)
	r, err := OpenReader(dir)
	must(t, err)
	defer r.Close()
	var done, of int
	rep, err := r.Verify(context.Background(), func(d, a int) { done, of = d, a })
	must(t, err)
	_, head, err := r.Head(context.Background())
	must(t, err)
	want := Report{Blocks: 6, Entries: 24, Lists: 3, First: 1, Last: 24, Head: head}
	if rep != want || done != 6 || of != 6 {
		t.Fatalf("report %+v after %d of %d, want %+v", rep, done, of, want)
	}
	same(t, readAll(t, r, Query{}), all)
	text, err := r.List(context.Background(), "sha256:1")
	if err != nil || string(text) != "a list a list " {
		t.Fatalf("list: %q %v", text, err)
	}
	if _, err := r.List(context.Background(), "sha256:9"); !errors.Is(err, ErrNoList) {
		t.Fatalf("a list that is not there: %v", err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := r.Verify(ctx, nil); !errors.Is(err, context.Canceled) {
		t.Fatalf("cancelled: %v", err)
	}
}

// Every byte of every body, digest, sum and text of a small record, flipped,
// is found. BW-029
func TestEveryFlippedByteIsFound(t *testing.T) {
	dir, _ := small(t)
	db := surgery(t, dir)
	r, err := OpenReader(dir)
	must(t, err)
	defer r.Close()
	flips := 0
	for _, column := range []struct{ table, key, name string }{
		{"block", "first", "body"}, {"block", "first", "digest"}, {"list", "block", "sum"}, {"list", "block", "text"},
	} {
		rows, err := db.Query(`SELECT ` + column.key + `, ` + column.name + ` FROM ` + column.table)
		must(t, err)
		cells := map[any][]byte{}
		for rows.Next() {
			var key any
			var b []byte
			must(t, rows.Scan(&key, &b))
			cells[key] = b
		}
		must(t, rows.Close())
		set := `UPDATE ` + column.table + ` SET ` + column.name + ` = ? WHERE ` + column.key + ` = ?`
		for key, cell := range cells {
			for i := 0; i < len(cell); i += thin {
				cell[i] ^= 1 << (i % 8)
				alter(t, db, set, cell, key)
				rep, err := r.Verify(context.Background(), nil)
				must(t, err)
				if rep.Damage == nil {
					t.Fatalf("%s.%s of %v: byte %d flipped and not found", column.table, column.name, key, i)
				}
				cell[i] ^= 1 << (i % 8)
				flips++
			}
			alter(t, db, set, cell, key)
		}
	}
	if rep := verify(t, dir); rep.Damage != nil {
		t.Fatalf("all put back: %v", rep.Damage)
	}
	t.Logf("%d bytes flipped one at a time, all found", flips)
}

func TestChangedColumnsAreFound(t *testing.T) {
	dir, _ := small(t)
	path := filepath.Join(dir, File)
	good, err := os.ReadFile(path)
	must(t, err)
	for _, change := range []string{
		`UPDATE block SET last = last - 1 WHERE first = 9`,
		`UPDATE block SET first = 10 WHERE first = 9`,
		`UPDATE block SET count = 3 WHERE first = 9`,
		`UPDATE block SET at_min = at_min - 1 WHERE first = 9`,
		`UPDATE block SET at_max = at_max + 1 WHERE first = 9`,
		`UPDATE block SET kinds = 0 WHERE first = 9`,
		`UPDATE block SET lists = 0 WHERE first = 9`,
		`UPDATE block SET size = size + 1 WHERE first = 9`,
		`UPDATE block SET size = -1 WHERE first = 9`,
		`UPDATE block SET digest = x'00' WHERE first = 9`,
		`UPDATE block SET body = NULL WHERE first = 9`,
		`UPDATE block SET body = NULL, content = digest WHERE first = 9`,
		`UPDATE block SET body = x'' WHERE first = 9`,
		`DELETE FROM block WHERE first = 9`,
		`DELETE FROM block WHERE first = 1`,
		`DELETE FROM block WHERE first = 21`,
		`INSERT INTO block SELECT 30, 33, count, at_min, at_max, kinds, 0, size, digest, content, body FROM block WHERE first = 5`,
		`UPDATE kind SET newest = 5 WHERE name = 'durable'`,
		`UPDATE kind SET newest = 0 WHERE name = 'hold'`,
		`UPDATE kind SET name = 'sighting' WHERE name = 'hold'`,
		`DELETE FROM kind WHERE name = 'hold'`,
		`UPDATE list SET digest = 'sha256:x' WHERE digest = 'sha256:1'`,
		`UPDATE list SET size = 0 WHERE digest = 'sha256:1'`,
		`UPDATE list SET sum = x'' WHERE digest = 'sha256:1'`,
		`UPDATE list SET block = 1 WHERE digest = 'sha256:1'`,
		`DELETE FROM list WHERE digest = 'sha256:1'`,
		`INSERT INTO list SELECT 9, 'sha256:8', sum, size, text FROM list WHERE digest = 'sha256:1'`,
		`INSERT INTO list SELECT block, 'sha256:9', sum, size, text FROM list WHERE digest = 'sha256:1'`,
	} {
		db := surgery(t, dir)
		alter(t, db, change)
		must(t, db.Close())
		if rep := verify(t, dir); rep.Damage == nil {
			t.Errorf("%s: not found", change)
		} else if rep.Damage.Mend == "" || rep.Damage.What == "" {
			t.Errorf("%s: %+v says too little", change, rep.Damage)
		}
		must(t, os.WriteFile(path, good, 0o600))
	}
}

// Bytes of the file itself, flipped at random places, never change an entry in
// silence: whoever reads gets the entries as written, or an error.
func TestFlippedFileBytesNeverChangeEntries(t *testing.T) {
	dir, all := small(t)
	path := filepath.Join(dir, File)
	good, err := os.ReadFile(path)
	must(t, err)
	// The seed is fixed so that a failure can be seen again.
	random := rand.New(rand.NewSource(7))
	tries, found := 400/thin, 0
	for range tries {
		bad := append([]byte(nil), good...)
		i := random.Intn(len(bad))
		bad[i] ^= byte(1 + random.Intn(255))
		must(t, os.WriteFile(path, bad, 0o600))
		r, err := OpenReader(dir)
		if err != nil {
			found++
			continue
		}
		rep, errVerify := r.Verify(context.Background(), nil)
		var got []Entry
		errRead := r.Read(context.Background(), Query{}, func(e Entry) error {
			got = append(got, e)
			return nil
		})
		must(t, r.Close())
		if errVerify != nil || rep.Damage != nil {
			found++
			for k := range got { // what came before the damage is right all the same
				same(t, got[k:k+1], all[k:k+1])
			}
			continue
		}
		must(t, errRead)
		same(t, got, all)
	}
	t.Logf("%d of %d flips anywhere in the file were found; the others touch nothing that is read", found, tries)
}
