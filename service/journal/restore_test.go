package journal

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func TestTornLastBlockIsCut(t *testing.T) {
	for name, tear := range map[string]string{
		"shorter": `UPDATE block SET body = substr(body, 1, length(body) - 7) WHERE first = 21`,
		"empty":   `UPDATE block SET body = x'' WHERE first = 21`,
		"zeroed":  `UPDATE block SET body = zeroblob(length(body)) WHERE first = 21`,
		"digest":  `UPDATE block SET digest = zeroblob(32) WHERE first = 21`,
		"short":   `UPDATE block SET digest = x'00' WHERE first = 21`,
	} {
		t.Run(name, func(t *testing.T) {
			dir, all := small(t)
			db := surgery(t, dir)
			alter(t, db, tear)
			must(t, db.Close())
			j := mustOpen(t, Options{Dir: dir})
			cut := j.Cut()
			if s := j.State(); cut == nil || cut.First != 21 || s.Damage != nil || s.Durable != 20 || s.Queued != 20 {
				t.Fatalf("cut %v, state %+v", cut, s)
			}
			if !strings.Contains(cut.String(), "21 to 24") {
				t.Fatalf("notice: %s", cut)
			}
			ctx := context.Background()
			same(t, readAll(t, j.Reader, Query{}), all[:20])
			if e, ok, err := j.LastOf(ctx, KindDurable); err != nil || !ok || e.Seq != 20 {
				t.Fatalf("newest durable: %v %v %v", e, ok, err)
			}
			must(t, j.Append(entries(21, 22, "hold")))
			must(t, j.Flush(ctx))
			rep, err := j.Verify(ctx, nil)
			if err != nil || rep.Damage != nil || rep.Cuts != 1 || rep.Last != 22 {
				t.Fatalf("verify: %+v %v", rep, err)
			}
			must(t, j.Close())
			if j := mustOpen(t, Options{Dir: dir}); j.Cut() != nil {
				t.Fatal("told again at the next start")
			}
		})
	}
}

func TestEarlierDamageStartsDamaged(t *testing.T) {
	for name, harm := range map[string]string{
		"before the last":   `UPDATE block SET body = x'00' WHERE first = 17`,
		"last two":          `UPDATE block SET body = x'00' WHERE first >= 17`,
		"index of kinds":    `UPDATE kind SET newest = 5 WHERE name = 'durable'`,
		"no index of kinds": `DELETE FROM kind WHERE name = 'durable'`,
		"end missing":       `DELETE FROM block WHERE first = 21`,
		"pruned too far":    `UPDATE block SET body = NULL WHERE first = 17`,
	} {
		t.Run(name, func(t *testing.T) {
			dir, _ := small(t)
			db := surgery(t, dir)
			alter(t, db, harm)
			must(t, db.Close())
			j := mustOpen(t, Options{Dir: dir})
			s := j.State()
			if s.Damage == nil || s.Damage.Mend == "" || s.Sound || j.Cut() != nil {
				t.Fatalf("state %+v, cut %v", s, j.Cut())
			}
			// The record goes on behind the damage, and says so to the end.
			n := s.Queued + 1
			must(t, j.Append(entries(n, n+1, "hold")))
			must(t, j.Flush(context.Background()))
			if s := j.State(); s.Durable != n+1 || s.Sound {
				t.Fatalf("after more entries: %+v", s)
			}
		})
	}
}

// What is damaged before the newest durable entry does not keep the service
// from starting; Verify finds it, and from then on the record is not sound.
func TestVerifyFindsOldDamage(t *testing.T) {
	dir, _ := small(t)
	db := surgery(t, dir)
	alter(t, db, `UPDATE block SET body = x'00' WHERE first = 5`)
	must(t, db.Close())
	j := mustOpen(t, Options{Dir: dir})
	if s := j.State(); !s.Sound {
		t.Fatalf("at the start: %+v", s)
	}
	rep, err := j.Verify(context.Background(), nil)
	if err != nil || rep.Damage == nil || rep.Damage.First != 5 {
		t.Fatalf("verify: %+v %v", rep, err)
	}
	if s := j.State(); s.Sound || s.Damage == nil {
		t.Fatalf("after: %+v", s)
	}
}

func TestNotADatabase(t *testing.T) {
	dir, _ := small(t)
	path := filepath.Join(dir, File)
	must(t, os.WriteFile(path, []byte(strings.Repeat("no record ", 1000)), 0o600))
	j := mustOpen(t, Options{Dir: dir})
	if s := j.State(); s.Damage == nil || s.Sound {
		t.Fatalf("state %+v", s)
	}
	must(t, j.Append(entries(1, 1, "hold")))
	if err := j.Flush(context.Background()); err == nil {
		t.Fatal("wrote into something that is no record")
	}
	var d *Damage
	if _, _, err := j.LastOf(context.Background(), KindDurable); !errors.As(err, &d) {
		t.Fatalf("reading it: %v", err)
	}
	after, err := os.ReadFile(path)
	must(t, err)
	if !strings.HasPrefix(string(after), "no record no record") {
		t.Fatal("the file was changed")
	}
}

func TestForeignDatabaseIsRefused(t *testing.T) {
	for name, make := range map[string]string{
		"something else": `CREATE TABLE t (x)`,
		"other id":       `PRAGMA application_id = 5`,
		"later layout":   `PRAGMA user_version = 2`,
	} {
		dir := place(t)
		must(t, os.Mkdir(dir, 0o700))
		if name == "later layout" {
			j := mustOpen(t, Options{Dir: dir})
			must(t, j.Close())
		} else {
			must(t, os.WriteFile(filepath.Join(dir, File), nil, 0o600))
		}
		db := surgery(t, dir)
		alter(t, db, make)
		must(t, db.Close())
		if _, err := Open(Options{Dir: dir, Clock: newHandClock()}); !errors.Is(err, errForeign) {
			t.Errorf("%s: %v", name, err)
		}
		if _, err := OpenReader(dir); !errors.Is(err, errForeign) {
			t.Errorf("%s, reading: %v", name, err)
		}
	}
}
