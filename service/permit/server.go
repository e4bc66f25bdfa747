package permit

import (
	"context"
	"crypto/tls"
	"errors"
	"io"
	"log"
	"net"
	"net/http"
	"sync"
	"time"
)

// Bounds of the listener. The header's is Go's, which allows 4 KiB more.
const (
	MaxConnections = 256
	maxHeader      = 4 << 10
	headerTime     = 2 * time.Second
	requestTime    = 2 * time.Second
	answerTime     = 2 * time.Second
	idleTime       = 30 * time.Second
	stopTime       = time.Second
)

// Server is the permit listener. A reader that comes when MaxConnections are
// open takes the place of the one that has been quiet longest, so that nobody
// keeps the interlock out by holding connections.
type Server struct {
	http  http.Server
	limit int

	mu    sync.Mutex
	order uint64
	open  map[net.Conn]connection
	shut  uint64
}

type connection struct {
	busy bool   // a request is being answered
	last uint64 // when it was opened or last became quiet, in order
}

// NewServer makes a server of a handler, usually NewHandler's behind what
// checks access. limit bounds the connections; 0 is MaxConnections.
func NewServer(h http.Handler, limit int) *Server {
	if limit <= 0 {
		limit = MaxConnections
	}
	s := &Server{limit: limit, open: map[net.Conn]connection{}}
	s.http = http.Server{
		Handler: h, ReadHeaderTimeout: headerTime, ReadTimeout: requestTime, WriteTimeout: answerTime, IdleTimeout: idleTime,
		MaxHeaderBytes: maxHeader, ConnState: s.watch, ErrorLog: log.New(io.Discard, "", 0),
	}
	s.http.Protocols = new(http.Protocols)
	s.http.Protocols.SetHTTP1(true)
	return s
}

// Serve answers on a listener until ctx ends, and closes it. Requests that are
// being answered then have a second. It returns nil after ctx ended.
func (s *Server) Serve(ctx context.Context, l net.Listener) error {
	ended := make(chan struct{})
	stopped := make(chan struct{})
	go func() {
		defer close(stopped)
		select {
		case <-ctx.Done():
		case <-ended:
		}
		short, cancel := context.WithTimeout(context.WithoutCancel(ctx), stopTime)
		defer cancel()
		if s.http.Shutdown(short) != nil {
			_ = s.http.Close()
		}
	}()
	err := s.http.Serve(l)
	close(ended)
	<-stopped
	if errors.Is(err, http.ErrServerClosed) && ctx.Err() != nil {
		return nil
	}
	return err
}

// watch keeps account of the connections and makes room.
func (s *Server) watch(c net.Conn, state http.ConnState) {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.order++
	switch state {
	case http.StateNew:
		if len(s.open) >= s.limit {
			s.makeRoom()
		}
		s.open[c] = connection{last: s.order}
	case http.StateActive, http.StateIdle:
		if _, ok := s.open[c]; ok {
			s.open[c] = connection{busy: state == http.StateActive, last: s.order}
		}
	case http.StateClosed, http.StateHijacked:
		delete(s.open, c)
	}
}

// makeRoom closes the connection that has been quiet longest or, where none is
// quiet, the one whose request has lasted longest: an answer takes well under a
// millisecond. s.mu is held.
func (s *Server) makeRoom() {
	var worst net.Conn
	for c, is := range s.open {
		if was := s.open[worst]; worst == nil || was.busy && !is.busy || was.busy == is.busy && is.last < was.last {
			worst = c
		}
	}
	delete(s.open, worst)
	s.shut++
	if t, ok := worst.(*tls.Conn); ok {
		worst = t.NetConn() // a farewell could block
	}
	_ = worst.Close()
}

// Connections returns how many are open, and how many were shut to make room.
func (s *Server) Connections() (open int, shut uint64) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return len(s.open), s.shut
}
