package client

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"strconv"
	"time"
)

// Event is one event of the stream: view, decision, hold, list, rules or
// reset. After a reset what was known of changes is to be forgotten; a view
// follows.
type Event struct {
	ID   string // boot_id.number
	Name string
	Data json.RawMessage
}

// maxEvent bounds one event.
const maxEvent = 16 << 20

// silence is how long a stream may say nothing: it has a heartbeat.
const silence = 30 * time.Second

// Stream gives each event to each, and reconnects where it left off when the
// connection ends, until ctx ends, each returns an error, or the service
// refuses for good. from is the ID of the last event of an earlier stream;
// empty: start with the whole view.
func (c *Client) Stream(ctx context.Context, from string, each func(Event) error) error {
	wait := time.Second
	for {
		err := c.streamOnce(ctx, &from, &wait, each)
		var stop *stopped
		var p *Problem
		switch {
		case ctx.Err() != nil:
			return ctx.Err()
		case errors.As(err, &stop):
			return stop.err
		case errors.As(err, &p) && !p.Temporary():
			return p
		}
		if p != nil && p.RetryAfter > 0 {
			wait = max(wait, p.RetryAfter)
		}
		t := time.NewTimer(wait)
		select {
		case <-t.C:
		case <-ctx.Done():
			t.Stop()
			return ctx.Err()
		}
		wait = min(2*wait, 30*time.Second)
	}
}

// stopped is the error of who takes the events.
type stopped struct{ err error }

func (s *stopped) Error() string { return s.err.Error() }

// streamOnce reads one connection to its end. wait becomes what the service
// says once it has said anything.
func (c *Client) streamOnce(ctx context.Context, from *string, wait *time.Duration, each func(Event) error) error {
	ctx, cancel := context.WithCancel(ctx)
	defer cancel()
	q := get("v1", "stream")
	q.accepts = "text/event-stream"
	q.header = http.Header{}
	if *from != "" {
		q.header.Set("Last-Event-ID", *from)
	}
	out, err := c.do(ctx, q)
	if err != nil {
		return err
	}
	defer out.Body.Close()
	quiet := time.AfterFunc(silence, cancel)
	defer quiet.Stop()
	lines := bufio.NewReaderSize(out.Body, 64<<10)
	var e Event
	var data []byte
	for {
		line, err := readLine(lines)
		if err != nil {
			return err
		}
		quiet.Reset(silence)
		if len(line) == 0 {
			if len(data) > 0 {
				e.Data = data
				if err := each(e); err != nil {
					return &stopped{err}
				}
				*from = e.ID
			}
			e, data = Event{ID: e.ID}, nil
			continue
		}
		name, value, _ := bytes.Cut(line, []byte{':'})
		value = bytes.TrimPrefix(value, []byte{' '})
		switch string(name) {
		case "id":
			e.ID = string(value)
		case "event":
			e.Name = string(value)
		case "data":
			if data != nil {
				data = append(data, '\n')
			}
			data = append(data, value...)
		case "retry":
			if ms, err := strconv.ParseUint(string(value), 10, 31); err == nil {
				*wait = time.Duration(ms) * time.Millisecond
			}
		}
	}
}

// readLine reads a line without its end. A line that is cut is none.
func readLine(r *bufio.Reader) ([]byte, error) {
	var whole []byte
	for {
		part, err := r.ReadSlice('\n')
		whole = append(whole, part...)
		switch {
		case errors.Is(err, bufio.ErrBufferFull):
			if len(whole) > maxEvent {
				return nil, fmt.Errorf("an event is over %d bytes", maxEvent)
			}
			continue
		case err == io.EOF:
			return nil, io.ErrUnexpectedEOF
		case err != nil:
			return nil, err
		}
		return bytes.TrimSuffix(bytes.TrimSuffix(whole, []byte{'\n'}), []byte{'\r'}), nil
	}
}
