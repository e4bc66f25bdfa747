package feed

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"time"

	"beamward/closures"
	"beamward/service/feed/modes"
)

// ModeSOptions are what a Mode S feed is made of. One of Dial and File is set.
type ModeSOptions struct {
	Intake  Intake
	Clock   Clock
	Notice  Notice // nil: nobody is told
	Decoder modes.Options
	Dial    string // address that is called
	File    string // file that is followed

	// Jitter spreads the redialling of many: from 0 up to 1. Nil: none.
	Jitter func() float64
	// Stall bounds by how much frames may be read late: they tell no time of
	// their own, so that what waited longer is thrown away. 1 s; a clock that
	// is driven faster than the machine's needs more.
	Stall time.Duration
}

// ModeS takes Mode S frames, as receivers send them in hexadecimal lines.
// Frames that intake has no room for are dropped: they cannot wait, since
// their time is that of their reading.
type ModeS struct {
	*desk
	options ModeSOptions
	source  closures.Source

	mu      sync.Mutex // of what follows
	decoder *modes.Decoder
}

// NewModeS starts nothing.
func NewModeS(o ModeSOptions) (*ModeS, error) {
	what := o.Dial + o.File
	source := o.Decoder.Source
	d, err := newDesk(Options{Bound: []Bound{{Name: source, Aircraft: true}}, Intake: o.Intake, Clock: o.Clock, Notice: o.Notice})
	if err == nil && (o.Dial == "") == (o.File == "") {
		err = errors.New("state one of an address to call and a file")
	}
	var decoder *modes.Decoder
	if err == nil {
		decoder, err = modes.NewDecoder(o.Decoder)
	}
	if err != nil {
		return nil, fmt.Errorf("making the Mode S feed from %s: %w", what, err)
	}
	if o.Stall <= 0 {
		o.Stall = time.Second
	}
	return &ModeS{desk: d, options: o, source: source, decoder: decoder}, nil
}

// Counts returns what became of the frames so far.
func (m *ModeS) Counts() modes.Counts {
	m.mu.Lock()
	defer m.mu.Unlock()
	return m.decoder.Counts()
}

// Callsigns returns the identifications heard, by the reports' aircraft.
func (m *ModeS) Callsigns() map[string]string {
	m.mu.Lock()
	defer m.mu.Unlock()
	return m.decoder.Callsigns()
}

// Run receives until ctx ends.
func (m *ModeS) Run(ctx context.Context) error {
	if m.options.Dial != "" {
		return m.redial(ctx)
	}
	var s *frames
	o := &follower{path: m.options.File, clock: m.options.Clock, desk: m.desk, skip: m.options.Stall, begin: func() { s = m.frames(m.options.File) }}
	o.line = func(text []byte, long bool) error { return s.take(ctx, text, long) }
	return o.run(ctx)
}

// frames is one connection, or one reading of a file.
type frames struct {
	*sender
	m *ModeS

	alive  bool // the link showed that it lives, since the last word of it
	told   time.Duration
	proven uint64 // frames when last looked
	minute perMinute
}

func (m *ModeS) frames(from string) *frames {
	f := &frames{sender: m.sender(from, false), m: m, proven: m.Counts().Proven}
	f.told = m.desk.options.Clock.Boot() - heardEvery
	return f
}

// heardEvery is how often it is told that the source lives.
const heardEvery = time.Second

// take takes in one line. Only the end of ctx is an error.
func (f *frames) take(ctx context.Context, text []byte, long bool) error {
	if long {
		f.tooLong(text)
		return ctx.Err()
	}
	f.n++
	if len(text) == 0 {
		return ctx.Err()
	}
	at := f.now()
	f.line(len(text), at)
	frame, ok, err := modes.ParseLine(text)
	if err != nil {
		f.refuseLine(at, err.Error(), text)
		return ctx.Err()
	}
	var seen closures.AircraftSeen
	f.alive = f.alive || !ok
	if ok {
		f.m.mu.Lock()
		seen, ok = f.m.decoder.Decode(&frame, at)
		f.m.mu.Unlock()
	}
	if ok {
		if err := f.hand(ctx, f.m.source, seen, text); err != nil {
			return err
		}
	}
	return f.live(ctx, at)
}

// live tells now and then that the source lives: by how many frames of right
// parity came in the last minute, which proves reception, or else that the
// link does.
func (f *frames) live(ctx context.Context, at time.Time) error {
	now := f.m.desk.options.Clock.Boot()
	if now-f.told < heardEvery {
		return ctx.Err()
	}
	f.told = now
	proven := f.m.Counts().Proven
	fresh := proven - f.proven
	f.minute.add(now, fresh)
	f.proven = proven
	heard := closures.Heard{Source: f.m.source, Said: at, MessagesPerMinute: nan}
	switch {
	case fresh > 0:
		heard.Scope, heard.MessagesPerMinute = closures.HeardReception, f.minute.sum(now)
	case f.alive:
	default:
		return ctx.Err()
	}
	f.alive = false
	return f.hand(ctx, f.m.source, heard, nil)
}

// perMinute counts what came in the last 60 seconds.
type perMinute struct {
	counts  [60]uint64
	seconds [60]int64
}

func (p *perMinute) add(now time.Duration, n uint64) {
	s := int64(now / time.Second)
	i := s % 60
	if p.seconds[i] != s {
		p.seconds[i], p.counts[i] = s, 0
	}
	p.counts[i] += n
}

func (p *perMinute) sum(now time.Duration) float64 {
	var n uint64
	for i, s := range p.seconds {
		if age := int64(now/time.Second) - s; age >= 0 && age < 60 {
			n += p.counts[i]
		}
	}
	return float64(n)
}
