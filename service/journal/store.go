package journal

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"net/url"
	"os"
	"strings"
)

// The file says what it is: application_id "bwrc", user_version the layout.
const (
	applicationID = 0x62777263
	layoutVersion = 1
)

const schema = `
CREATE TABLE block (
	first  INTEGER PRIMARY KEY, -- number of the first entry
	last   INTEGER NOT NULL,
	count  INTEGER NOT NULL,
	at_min INTEGER NOT NULL,    -- microseconds since 1970
	at_max INTEGER NOT NULL,
	kinds  INTEGER NOT NULL,    -- bit n: an entry of the kind with id n; bit 63: of any kind from id 63 on
	lists  INTEGER NOT NULL,    -- texts recorded with the block
	size   INTEGER NOT NULL,    -- bytes of the entries before compression
	digest BLOB NOT NULL,
	content BLOB,               -- content digest, once the body is pruned
	body   BLOB                 -- NULL: pruned
) STRICT;
CREATE INDEX block_at ON block (at_max, at_min);
CREATE TABLE kind (
	id     INTEGER PRIMARY KEY,
	name   TEXT NOT NULL UNIQUE,
	newest INTEGER NOT NULL     -- first of the newest block with an entry of this kind
) STRICT;
CREATE TABLE list (
	block  INTEGER NOT NULL,    -- first of the block it was recorded with
	digest TEXT NOT NULL,
	sum    BLOB NOT NULL,
	size   INTEGER NOT NULL,
	text   BLOB,                -- NULL: pruned; the text may be recorded again with a later block
	PRIMARY KEY (block, digest)
) STRICT;
CREATE INDEX list_digest ON list (digest, block);
CREATE TABLE cut (
	at     INTEGER NOT NULL,    -- when it was cut, microseconds since 1970
	why    TEXT NOT NULL,
	first  INTEGER, last INTEGER, count INTEGER, size INTEGER, digest BLOB, body BLOB
) STRICT;
`

// store is the one writing connection. It is opened anew after every error, so
// that a retry starts from what the file says and not from what SQLite had in
// memory.
type store struct {
	path  string
	fault func(op string) error
	db    *sql.DB
	conn  *sql.Conn
	info  os.FileInfo // of the file that is open
	kinds map[string]kindRow

	head, insert, list, newKind, oldKind *sql.Stmt
}

type kindRow struct {
	id     int64
	newest uint64
}

// bit is the mask of a kind in the column kinds.
func (k kindRow) bit() uint64 { return 1 << min(k.id, 63) }

// dsn names path for the driver, with pragmas in the order given.
func dsn(path, mode string, pragmas ...string) string {
	q := url.Values{"mode": {mode}, "_pragma": append([]string{"busy_timeout(2000)", "trusted_schema(0)", "cell_size_check(1)"}, pragmas...)}
	return "file:" + (&url.URL{Path: path}).EscapedPath() + "?" + q.Encode()
}

// open connects to an existing file, making the tables in an empty one. The
// errors of a file that belongs to something else are not worth a retry:
// errForeign.
func (s *store) open(ctx context.Context) (err error) {
	if err := s.fault("open"); err != nil {
		return err
	}
	info, err := os.Stat(s.path)
	if err != nil {
		return err
	}
	if s.info != nil && !os.SameFile(s.info, info) {
		return errMoved
	}
	db, err := sql.Open("sqlite", dsn(s.path, "rw", "synchronous(FULL)", "journal_size_limit(67108864)"))
	if err != nil {
		return err
	}
	defer func() {
		if err != nil {
			s.close()
		}
	}()
	s.db = db
	s.db.SetMaxOpenConns(1)
	if s.conn, err = db.Conn(ctx); err != nil {
		return err
	}
	if err := s.schema(ctx); err != nil {
		return err
	}
	if s.kinds, err = readKinds(ctx, s.conn); err != nil {
		return err
	}
	for _, p := range []struct {
		stmt **sql.Stmt
		text string
	}{
		{&s.head, `SELECT last, digest FROM block ORDER BY first DESC LIMIT 1`},
		{&s.insert, `INSERT INTO block (first, last, count, at_min, at_max, kinds, lists, size, digest, body) VALUES (?,?,?,?,?,?,?,?,?,?)`},
		{&s.list, `INSERT INTO list (block, digest, sum, size, text) VALUES (?,?,?,?,?)`},
		{&s.newKind, `INSERT INTO kind (id, name, newest) VALUES (?,?,?)`},
		{&s.oldKind, `UPDATE kind SET newest = ? WHERE id = ?`},
	} {
		if *p.stmt, err = s.conn.PrepareContext(ctx, p.text); err != nil {
			return err
		}
	}
	s.info = info
	return nil
}

var errForeign = errors.New("not a record that this build can write")

// identify reads whose file it is. Both zero: an empty one.
func identify(ctx context.Context, c interface {
	QueryRowContext(context.Context, string, ...any) *sql.Row
}) (app, version int64, err error) {
	if err := c.QueryRowContext(ctx, `PRAGMA application_id`).Scan(&app); err != nil {
		return 0, 0, err
	}
	if err := c.QueryRowContext(ctx, `PRAGMA user_version`).Scan(&version); err != nil {
		return 0, 0, err
	}
	return app, version, nil
}

func foreign(path string, app, version int64) error {
	switch {
	case app != applicationID:
		return fmt.Errorf("%s is a database of something else: move it away: %w", path, errForeign)
	case version != layoutVersion:
		return fmt.Errorf("%s has layout %d and this build knows %d: use the build that wrote it: %w", path, version, layoutVersion, errForeign)
	}
	return nil
}

func (s *store) schema(ctx context.Context) error {
	app, version, err := identify(ctx, s.conn)
	if err != nil {
		return err
	}
	var tables int
	if err := s.conn.QueryRowContext(ctx, `SELECT count(*) FROM sqlite_schema`).Scan(&tables); err != nil {
		return err
	}
	if app != 0 || version != 0 || tables != 0 {
		if err := foreign(s.path, app, version); err != nil {
			return err
		}
	}
	var mode string
	if err := s.conn.QueryRowContext(ctx, `PRAGMA journal_mode=WAL`).Scan(&mode); err != nil {
		return err
	}
	if !strings.EqualFold(mode, "wal") {
		return fmt.Errorf("the file system of %s does not carry a write-ahead log: put data_dir on a local disk: %w", s.path, errForeign)
	}
	if tables != 0 {
		return nil
	}
	// One transaction: a crash leaves either an empty file or a whole one.
	_, err = s.conn.ExecContext(ctx, fmt.Sprintf("BEGIN IMMEDIATE; %s PRAGMA application_id=%d; PRAGMA user_version=%d; COMMIT;", schema, applicationID, layoutVersion))
	return err
}

func readKinds(ctx context.Context, c interface {
	QueryContext(context.Context, string, ...any) (*sql.Rows, error)
}) (map[string]kindRow, error) {
	rows, err := c.QueryContext(ctx, `SELECT id, name, newest FROM kind`)
	if err != nil {
		return nil, err
	}
	defer rows.Close()
	kinds := map[string]kindRow{}
	for rows.Next() {
		var k kindRow
		var name string
		if err := rows.Scan(&k.id, &name, &k.newest); err != nil {
			return nil, err
		}
		if k.id < 0 {
			return nil, &Damage{What: fmt.Sprintf("kind %q has the id %d", name, k.id), Mend: mendDamage}
		}
		kinds[name] = k
	}
	return kinds, rows.Err()
}

// close lets go of the file. Errors do not matter: what counts was committed.
// A transaction or a statement left open would keep SQLite's connection, and
// with it the lock, alive.
func (s *store) close() {
	for _, stmt := range []**sql.Stmt{&s.head, &s.insert, &s.list, &s.newKind, &s.oldKind} {
		if *stmt != nil {
			_ = (*stmt).Close()
			*stmt = nil
		}
	}
	if s.conn != nil {
		_, _ = s.conn.ExecContext(context.Background(), `ROLLBACK`) // fails where none is open
		_ = s.conn.Close()
	}
	if s.db != nil {
		_ = s.db.Close()
	}
	s.db, s.conn = nil, nil
}
