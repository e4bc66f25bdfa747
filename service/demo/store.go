package demo

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"net/url"
	"path/filepath"

	"beamward/service/journal"
)

// storeLock keeps the service from writing its record, as another program
// would that holds the file: it begins a transaction and ends it later without
// a change.
type storeLock struct {
	db   *sql.DB
	conn *sql.Conn
}

// holdStore takes the lock or lets it go.
func (s *stage) holdStore(ctx context.Context, held bool) error {
	switch {
	case held == (s.lock != nil):
		return nil
	case !held:
		err := s.lock.release()
		s.lock = nil
		return err
	}
	l, err := lockStore(ctx, filepath.Join(s.dir, "var", journal.File))
	s.lock = l
	return err
}

func lockStore(ctx context.Context, path string) (*storeLock, error) {
	name := url.URL{Scheme: "file", OmitHost: true, Path: path, RawQuery: "_pragma=busy_timeout(5000)"}
	db, err := sql.Open("sqlite", name.String()) // the driver is the journal's
	if err != nil {
		return nil, fmt.Errorf("holding the record's file: %w", err)
	}
	l := &storeLock{db: db}
	if l.conn, err = db.Conn(ctx); err == nil {
		_, err = l.conn.ExecContext(ctx, "BEGIN IMMEDIATE")
	}
	if err != nil {
		_ = db.Close()
		return nil, fmt.Errorf("holding the record's file: %w", err)
	}
	return l, nil
}

func (l *storeLock) release() error {
	_, err := l.conn.ExecContext(context.Background(), "ROLLBACK")
	return errors.Join(err, l.conn.Close(), l.db.Close())
}
