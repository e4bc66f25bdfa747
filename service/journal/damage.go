package journal

import (
	"errors"
	"fmt"
	"io/fs"
	"syscall"

	"modernc.org/sqlite"
	sqlite3 "modernc.org/sqlite/lib"
)

// Damage is a place in the record that is not as it was written.
type Damage struct {
	First, Last uint64 // numbers of the entries concerned, as far as known; 0: the file as a whole
	What        string
	Mend        string
}

// Error says what, where and the mend.
func (d *Damage) Error() string {
	where := "the record is damaged"
	if d.First != 0 {
		where = fmt.Sprintf("the record is damaged at entries %d to %d", d.First, d.Last)
	}
	return fmt.Sprintf("%s: %s: %s", where, d.What, d.Mend)
}

// mendDamage is the way out of every damage; which one is for the operator to
// judge, since the second loses what the first keeps.
const mendDamage = "stop the service, keep the folder as evidence, and start it on a new data_dir with the newest good backup " +
	"copied in as record.db; without one start empty and place holds and lists again"

// PrunedError is returned where the entries asked for are past their keeping:
// their digests are left.
type PrunedError struct{ First, Last uint64 }

// Error names the entries.
func (e *PrunedError) Error() string {
	return fmt.Sprintf("entries %d to %d are pruned: their digests are kept, a copy of the entries may be in a backup or an export", e.First, e.Last)
}

// StoreError is an error of the store below the journal.
type StoreError struct {
	Op   string // what was being done
	Mend string
	Err  error
}

// Error says what was done, the cause and the mend.
func (e *StoreError) Error() string { return fmt.Sprintf("%s: %v: %s", e.Op, e.Err, e.Mend) }

// Unwrap gives the cause.
func (e *StoreError) Unwrap() error { return e.Err }

// errMoved: the file under the record's name is not the one that is open.
var errMoved = errors.New("the record's file was moved, deleted or replaced while in use")

// storeError adds the mend that fits the cause.
func storeError(op string, err error) error {
	var known *StoreError
	var damage *Damage
	if errors.As(err, &known) || errors.As(err, &damage) {
		return err
	}
	mend := "see the cause; the record tries again by itself"
	switch {
	case errors.Is(err, errMoved):
		mend = "put the file back, or stop the service and start it again"
	case is(err, sqlite3.SQLITE_FULL), errors.Is(err, syscall.ENOSPC), errors.Is(err, syscall.EDQUOT):
		mend = "free space on the disk of data_dir; the record goes on by itself"
	case is(err, sqlite3.SQLITE_READONLY), is(err, sqlite3.SQLITE_PERM), errors.Is(err, syscall.EROFS), errors.Is(err, fs.ErrPermission):
		mend = "make data_dir and its disk writable to this user; the record goes on by itself"
	case is(err, sqlite3.SQLITE_IOERR), is(err, sqlite3.SQLITE_CANTOPEN), errors.Is(err, syscall.EIO):
		mend = "look after the disk of data_dir; the record goes on by itself when it is well"
	case is(err, sqlite3.SQLITE_BUSY), is(err, sqlite3.SQLITE_LOCKED):
		mend = "close the other program that has record.db open"
	case corrupt(err):
		mend = mendDamage
	}
	return &StoreError{Op: op, Mend: mend, Err: err}
}

// damageOf is the damage that err tells of; nil where it tells of none.
func damageOf(err error) *Damage {
	var d *Damage
	switch {
	case errors.As(err, &d):
		return d
	case corrupt(err):
		return &Damage{What: err.Error(), Mend: mendDamage}
	}
	return nil
}

// corrupt says whether SQLite found its own file damaged.
func corrupt(err error) bool {
	return is(err, sqlite3.SQLITE_CORRUPT) || is(err, sqlite3.SQLITE_NOTADB)
}

// is compares the primary result code; the upper bits carry detail.
func is(err error, code int) bool {
	var e *sqlite.Error
	return errors.As(err, &e) && e.Code()&0xff == code
}
