package api

import (
	"bufio"
	"bytes"
	"errors"
	"io"
	"net/http"
	"sync"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/access"
)

func factRoutes() []route {
	return []route{{method: "POST", path: "/v1/facts", id: "facts", summary: "Facts from outside, one JSON object a line; sending one again is harmless", action: access.Tell, budget: forFeeding,
		takes: []string{"application/x-ndjson", "application/ndjson", "application/jsonl"}, answer: factsDoc{}, serve: (*call).facts}}
}

// factsDoc says what became of a body of facts.
type factsDoc struct {
	Accepted     int           `json:"accepted" doc:"lines taken in, those that superseded one included"`
	Superseded   int           `json:"superseded" doc:"of these, lines that took the place of one of the same source and subject that still waited, or came too late for it"`
	RefusedTotal int           `json:"refused_total"`
	Refused      []refusedLine `json:"refused" doc:"the first 100"`
}

type refusedLine struct {
	Line  int    `json:"line" doc:"from 1"`
	Field string `json:"field,omitempty"`
	Cause string `json:"cause"`
	Mend  string `json:"mend,omitempty"`
}

const maxRefused = 100

// intake is the memory for one body of facts, used again for the next.
type intake struct {
	lines  *bufio.Reader
	parser *wire.Parser
}

// intakes keeps memory between bodies. Names are remembered by each parser, so
// that an aircraft heard a thousand times has one.
type intakes struct{ pool sync.Pool }

const (
	lineBuffer  = wire.MaxFactLine + 64<<10
	namesKept   = 20_000
	stampsEvery = 256 // lines between two looks at the clock
)

func (p *intakes) take(r io.Reader) *intake {
	in, _ := p.pool.Get().(*intake)
	if in == nil {
		in = &intake{lines: bufio.NewReaderSize(nil, lineBuffer), parser: wire.NewParser(namesKept)}
	}
	in.lines.Reset(r)
	return in
}

func (p *intakes) give(in *intake) {
	in.lines.Reset(nil)
	p.pool.Put(in)
}

// teller gives one client's lines to the engine.
type teller struct {
	c     *call
	rules *closures.Rules
	out   factsDoc

	name closures.Source // the last that was allowed
	role speaker         // as what
}

func (c *call) facts() error {
	body := c.body(c.api.limits.Facts, c.api.limits.LongTime)
	in := c.api.intakes.take(body)
	defer c.api.intakes.give(in)
	t := teller{c: c, rules: c.api.options.Engine.View().Rules}
	t.out.Refused = []refusedLine{}
	err := t.read(in)
	if err == nil {
		return c.reply(http.StatusOK, t.out)
	}
	out, internal := refusalOf(err)
	if internal && errors.Is(err, io.ErrUnexpectedEOF) {
		out, internal = refuse(http.StatusBadRequest, "the body ended before its end", "send it again"), false
	}
	if internal {
		return err
	}
	// What was taken in before stays, so the client is told how much that was.
	out.more = partDoc{"about:blank", out.Title, out.Status, out.Detail, out.Errors, t.out}
	return out
}

// partDoc is a problem document with what was done before the problem.
type partDoc struct {
	Type   string              `json:"type"`
	Title  string              `json:"title"`
	Status int                 `json:"status"`
	Detail string              `json:"detail"`
	Errors []wire.ProblemEntry `json:"errors,omitempty"`
	factsDoc
}

// read takes the body line by line. An error ends it; what came before stands.
func (t *teller) read(in *intake) error {
	received := t.c.wall()
	for n := 1; ; n++ {
		if n%stampsEvery == 0 {
			received = t.c.wall()
			if t.c.r.Context().Err() != nil {
				return t.c.r.Context().Err()
			}
		}
		line, err := in.lines.ReadSlice('\n')
		if errors.Is(err, bufio.ErrBufferFull) {
			t.refuse(n, &wire.FactError{Cause: "the line is too long", Mend: "send one JSON object a line"})
			if err := skipLine(in.lines); err != nil {
				return ended(err)
			}
			continue
		}
		if err != nil && (err != io.EOF || len(line) == 0) {
			return ended(err)
		}
		line = bytes.TrimSuffix(bytes.TrimSuffix(line, []byte{'\n'}), []byte{'\r'})
		if len(line) > 0 {
			if busy := t.line(in.parser, n, line, received); busy != nil {
				return busy
			}
		}
		if err == io.EOF {
			return nil
		}
	}
}

func skipLine(r *bufio.Reader) error {
	for {
		if _, err := r.ReadSlice('\n'); !errors.Is(err, bufio.ErrBufferFull) {
			return err
		}
	}
}

func ended(err error) error {
	if err == io.EOF {
		return nil
	}
	return err
}

// line takes one line. Only an engine that takes nothing more is an error.
func (t *teller) line(p *wire.Parser, n int, line []byte, received time.Time) error {
	name, body, err := p.Fact(line, received)
	if err != nil {
		t.refuse(n, err)
		return nil
	}
	if err := t.allowed(name, body); err != nil {
		t.refuse(n, err)
		return nil
	}
	superseded, err := t.c.api.options.Engine.Offer(name, body)
	if err != nil {
		var core *closures.Error
		if errors.As(err, &core) && core.Code != closures.Busy && core.Code != closures.Internal {
			t.refuse(n, &wire.FactError{Cause: core.Message, Mend: core.Mend})
			return nil
		}
		return err
	}
	t.out.Accepted++
	if superseded {
		t.out.Superseded++
	}
	return nil
}

func (t *teller) refuse(n int, err error) {
	if t.out.RefusedTotal++; len(t.out.Refused) >= maxRefused {
		return
	}
	one := refusedLine{Line: n, Cause: "it cannot be taken"}
	var f *wire.FactError
	if errors.As(err, &f) {
		one.Field, one.Cause, one.Mend = f.Field, f.Cause, f.Mend
	}
	t.out.Refused = append(t.out.Refused, one)
}
