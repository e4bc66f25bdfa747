package feed

import (
	"context"
	"errors"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// desk is where the lines of one feed are read, checked against what the feed
// is bound to, and handed to intake.
type desk struct {
	options Options
	bound   map[closures.Source]bool // value: a source of aircraft
	counters
	teller
}

func newDesk(o Options) (*desk, error) {
	if err := o.check(); err != nil {
		return nil, err
	}
	d := &desk{options: o, bound: map[closures.Source]bool{}}
	d.counters.clock, d.teller.clock, d.teller.tell = o.Clock, o.Clock, o.Notice
	for _, b := range o.Bound {
		d.bound[b.Name] = b.Aircraft
	}
	return d, nil
}

func (d *desk) now() time.Time { return d.options.Clock.Wall() }

// Stats returns what the feed has done so far.
func (d *desk) Stats() Stats { return d.stats() }

// sender is who speaks: one connection, one open file or one socket. It has
// one owner.
type sender struct {
	*desk
	from         string
	may          func(closures.Source) bool // nil: all that the feed is bound to
	waits        bool                       // a full intake is waited for
	onlyAircraft bool                       // only reports of aircraft are taken
	parser       *wire.Parser
	n            uint64 // lines so far
	begun        map[closures.Source]bool
}

// parsedNames bounds the names of aircraft, targets and people that a sender's
// parser remembers.
const parsedNames = 4096

func (d *desk) sender(from string, waits bool) *sender {
	return &sender{desk: d, from: from, waits: waits, begun: map[closures.Source]bool{}}
}

var errNotBound = errors.New("it speaks for a name that this feed is not bound to: bind the feed to it, or send it where it belongs")

// fact reads one line and hands on what it says. Only the end of ctx is an
// error.
func (s *sender) fact(ctx context.Context, line []byte) error {
	s.n++
	if len(line) == 0 {
		return ctx.Err()
	}
	at := s.now()
	s.line(len(line), at)
	if s.parser == nil {
		s.parser = wire.NewParser(parsedNames)
	}
	name, body, err := s.parser.Fact(line, at)
	if err == nil {
		err = s.allowed(name, body)
	}
	if err != nil {
		s.refuseLine(at, err.Error(), line)
		return ctx.Err()
	}
	return s.hand(ctx, name, body, line)
}

var errNotAircraft = errors.New("only reports of aircraft are taken here: send other facts over TCP or HTTP")

func (s *sender) allowed(name closures.Source, body closures.Body) error {
	if _, bound := s.bound[name]; !bound {
		return errNotBound
	}
	if s.may != nil && !s.may(name) {
		return errors.New("it speaks for a name that its token or certificate is not bound to")
	}
	if _, aircraft := body.(closures.AircraftSeen); s.onlyAircraft && !aircraft {
		return errNotAircraft
	}
	return nil
}

// hand gives a fact to intake: before the first of an aircraft source, that
// its reception starts again.
func (s *sender) hand(ctx context.Context, name closures.Source, body closures.Body, line []byte) error {
	if s.bound[name] && !s.begun[name] {
		began := closures.Heard{Source: name, Said: s.now(), MessagesPerMinute: nan, Connected: true}
		took, err := s.offer(ctx, name, began, line)
		if !took {
			return err
		}
		s.begun[name] = true
	}
	took, err := s.offer(ctx, name, body, line)
	if took {
		s.took(s.now())
	}
	return err
}

// offer tries until intake takes the fact or refuses it for good; one that does
// not wait tries once. The error is the end of ctx.
func (s *sender) offer(ctx context.Context, name closures.Source, body closures.Body, line []byte) (took bool, _ error) {
	for pause := busyFirst; ; pause = min(2*pause, busyMost) {
		err := s.options.Intake(name, body)
		switch {
		case err == nil:
			return true, nil
		case !busy(err):
			s.refuseLine(s.now(), err.Error(), line)
			return false, ctx.Err()
		case !s.waits:
			s.dropped.Add(1)
			s.notice("facts are dropped: intake is full", "from", s.from)
			return false, ctx.Err()
		case pause == busyFirst:
			s.waited.Add(1)
			s.notice("facts wait: intake is full", "from", s.from)
		}
		if err := sleep(ctx, s.options.Clock, pause); err != nil {
			return false, err
		}
	}
}

// tooLong counts and refuses a line of which only the beginning was kept.
func (s *sender) tooLong(line []byte) {
	s.n++
	at := s.now()
	s.line(len(line), at)
	s.refuseLine(at, errLong.Error(), line)
}

func (s *sender) refuseLine(at time.Time, cause string, line []byte) {
	s.refuse(at, s.from, s.n, cause, line)
	s.notice("a line is refused", "from", s.from, "line", s.n, "cause", printable([]byte(cause), 4*shownBytes), "text", shown(line))
}
