package api

import (
	"encoding/json"
	"net/http"
	"slices"
	"strconv"
	"strings"
	"time"

	"beamward/closures/wire"
	"beamward/service/access"
)

func recordRoutes() []route {
	return []route{{method: "GET", path: "/v1/record", id: "record", summary: "The record, page by page: admitted facts, decisions, what the service did", action: access.See,
		query: []param{
			{"after", "only entries of a larger number", countOf(0, 1<<53)}, {"before", "only entries of a smaller number", countOf(0, 1<<53)},
			{"since", "only entries from this time on", timeOf()}, {"until", "only entries before this time", timeOf()},
			{"kinds", "only these, with commas between", textOf(1000)}, {"order", "oldest where absent", wordOf("oldest", "newest")}, limitParam, cursorParam,
		}, answer: recordDoc{}, serve: (*call).record}}
}

type recordDoc struct {
	Entries []entryDoc `json:"entries"`
	Cursor  string     `json:"cursor" doc:"for the next page; empty: there is none at present"`
}

// entryDoc is one entry. Its body is as it was recorded: angles in radians,
// directions as vectors, numbers to the last bit.
type entryDoc struct {
	Seq  uint64    `json:"seq"`
	At   time.Time `json:"at"`
	Kind string    `json:"kind"`
	Body any       `json:"body"`
}

// maxKinds bounds how many kinds a query names.
const maxKinds = 32

func (c *call) record() error {
	limit, after, err := c.page("record", "after", "before", "since", "until", "kinds", "order")
	if err != nil {
		return err
	}
	q := RecordQuery{Limit: limit + 1}
	if q.After, err = c.count("after", 0, 1<<63-1, 0); err != nil {
		return err
	}
	if q.Before, err = c.count("before", 0, 1<<63-1, 0); err != nil {
		return err
	}
	if q.Since, err = c.instant("since", time.Time{}); err != nil {
		return err
	}
	if q.Until, err = c.instant("until", time.Time{}); err != nil {
		return err
	}
	order, err := c.word("order", "oldest", "newest")
	if err != nil {
		return err
	}
	q.NewestFirst = order == "newest"
	if c.has("kinds") {
		q.Kinds = strings.Split(c.query.Get("kinds"), ",")
		if len(q.Kinds) > maxKinds || slices.ContainsFunc(q.Kinds, func(k string) bool { return !validKind(k) }) {
			return badQuery("kinds", "they are no kinds of entries", "give at most 32 words of a-z 0-9 - . _ with commas between")
		}
	}
	if after != "" {
		n, err := strconv.ParseUint(after, 10, 63)
		if err != nil {
			return refuse(http.StatusBadRequest, "cursor: it is not one of this query", "start again without it")
		}
		if q.NewestFirst {
			q.Before = n
		} else {
			q.After = n
		}
	}
	if c.api.options.Record == nil {
		return refuse(http.StatusServiceUnavailable, "this service keeps no record that could be read", "")
	}
	give, err := c.slot()
	if err != nil {
		return err
	}
	defer give()
	entries, err := c.api.options.Record.Read(c.r.Context(), q)
	if err != nil {
		return err
	}
	out := recordDoc{Entries: []entryDoc{}}
	for i, e := range entries {
		if i == limit {
			out.Cursor = c.cursor("record", strconv.FormatUint(entries[limit-1].Seq, 10), "after", "before", "since", "until", "kinds", "order")
			break
		}
		out.Entries = append(out.Entries, entryOf(&e))
	}
	return c.reply(http.StatusOK, out)
}

// entryOf shows an entry. A body that is no JSON is shown as text.
func entryOf(e *RecordEntry) entryDoc {
	out := entryDoc{Seq: e.Seq, At: e.At.UTC(), Kind: e.Kind, Body: nil}
	var any json.RawMessage
	if wire.Strict(e.Body, &any) == nil {
		out.Body = any
	} else if len(e.Body) > 0 {
		out.Body = strings.ToValidUTF8(string(e.Body), "\ufffd")
	}
	return out
}

func validKind(k string) bool {
	return k != "" && len(k) <= 64 && !strings.ContainsFunc(k, func(r rune) bool {
		return !(r >= 'a' && r <= 'z' || r >= '0' && r <= '9' || r == '-' || r == '.' || r == '_')
	})
}
