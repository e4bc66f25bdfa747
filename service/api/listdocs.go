package api

import (
	"net/http"
	"sync"
	"time"

	"beamward/closures"
	"beamward/closures/listfile"
)

// ListHead is a list in a table of lists.
type ListHead struct {
	Authority  closures.AuthorityID `json:"authority"`
	ID         closures.ListID      `json:"id"`
	Status     string               `json:"status" enum:"waiting,in-force,replaced,withdrawn" doc:"a waiting list closes already and opens nothing"`
	Issued     time.Time            `json:"issued"`
	Covers     spanDoc              `json:"covers"`
	Beams      []closures.BeamID    `json:"beams" doc:"none: every beam"`
	Regions    int                  `json:"region_count"`
	Windows    int                  `json:"window_count"`
	Digest     string               `json:"digest"`
	By         string               `json:"by" doc:"who brought it"`
	Confirmed  string               `json:"confirmed_by"`
	Withdrawal string               `json:"withdrawal_asked_by" doc:"empty: nobody asked; else it waits for confirmation or is done"`
	Needs      string               `json:"needs" enum:"nothing,confirmation,second-person" doc:"what it waits for"`
	ETag       string               `json:"etag"`
}

func headOf(v *View, e *closures.Entry) ListHead {
	t := e.List.Text()
	out := ListHead{
		Authority: t.Authority, ID: t.ID, Status: e.Status.String(), Issued: t.Issued.UTC(), Covers: spanDoc{t.Covers.From.UTC(), t.Covers.Until.UTC()},
		Beams: t.Beams, Regions: len(t.Regions), Windows: len(t.Windows), Digest: t.Digest.String(), By: e.By, Confirmed: e.Confirmed,
		Withdrawal: e.Asked, Needs: "nothing", ETag: listTag(e),
	}
	if out.Beams == nil {
		out.Beams = []closures.BeamID{}
	}
	if e.Status == closures.ListWaiting || e.Asked != "" && e.Status != closures.ListGone {
		out.Needs = "confirmation"
		if v.loosening(e) == closures.LooseningSecondPerson {
			out.Needs = "second-person"
		}
	}
	return out
}

// Understood is what was read of a list.
type Understood struct {
	Replaces     []closures.ListID `json:"replaces"`
	UnlistedSky  string            `json:"unlisted_sky" enum:"open,closed"`
	ProofDigest  bool              `json:"proved_digest" doc:"it carried its digest, and that was right"`
	ProofCount   bool              `json:"proved_window_count"`
	RegionList   []regionSummary   `json:"regions" doc:"the first 1000"`
	ClosedTotalS float64           `json:"closed_total_s" doc:"of all regions, each on its own"`
}

type regionSummary struct {
	ID         string  `json:"id"`
	Shape      string  `json:"shape" enum:"icrs,horizon,track,whole_sky"`
	Throughout string  `json:"throughout" doc:"open, closed, or empty where windows say"`
	Windows    int     `json:"windows"`
	ClosedS    float64 `json:"closed_s" doc:"within the coverage, before lead and tail"`
}

const regionsShown = 1000

type listDoc struct {
	ListHead
	Understood
}

func understoodOf(s *listfile.Summary) Understood {
	out := Understood{Replaces: s.Replaces, UnlistedSky: "closed", ProofDigest: s.Proof.Digest, ProofCount: s.Proof.Count, RegionList: []regionSummary{}}
	if out.Replaces == nil {
		out.Replaces = []closures.ListID{}
	}
	if s.UnlistedOpen {
		out.UnlistedSky = "open"
	}
	for _, r := range s.Regions {
		out.ClosedTotalS += r.Closed.Seconds()
		if len(out.RegionList) == regionsShown {
			continue
		}
		one := regionSummary{ID: r.ID, Shape: r.Shape.String(), Windows: r.Windows, ClosedS: r.Closed.Seconds()}
		switch r.Throughout {
		case closures.ThroughoutClosed:
			one.Throughout = "closed"
		case closures.ThroughoutOpen:
			one.Throughout = "open"
		}
		out.RegionList = append(out.RegionList, one)
	}
	return out
}

// listOf is the whole document of a list.
func (a *API) listOf(v *View, e *closures.Entry) listDoc {
	return listDoc{headOf(v, e), a.summings.of(e.List)}
}

// summings remembers what summing up large lists gave.
type summings struct {
	mu sync.Mutex
	by map[*closures.List]Understood
}

const summingsKept = 64

func (s *summings) of(l *closures.List) Understood {
	s.mu.Lock()
	out, ok := s.by[l]
	s.mu.Unlock()
	if ok {
		return out
	}
	sum := listfile.Summarise(l.Text())
	out = understoodOf(&sum)
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.by == nil || len(s.by) >= summingsKept {
		s.by = map[*closures.List]Understood{}
	}
	s.by[l] = out
	return out
}

type listsDoc struct {
	Lists  []ListHead `json:"lists"`
	Cursor string     `json:"cursor" doc:"for the next page; empty: there is none"`
}

func (c *call) lists() error {
	v, _ := c.view()
	limit, from, err := c.page("lists", "status", "authority")
	if err != nil {
		return err
	}
	status, err := c.word("status", "", "waiting", "in-force", "replaced", "withdrawn")
	if err != nil {
		return err
	}
	authority, err := c.text("authority", 64)
	if err != nil {
		return err
	}
	out := listsDoc{Lists: []ListHead{}}
	for i := range v.Book {
		e := &v.Book[i]
		if status != "" && e.Status.String() != status || authority != "" && string(e.List.Authority()) != authority {
			continue
		}
		key := string(e.List.Authority()) + "\x00" + string(e.List.ID())
		if key <= from && from != "" {
			continue
		}
		if len(out.Lists) == limit {
			last := out.Lists[limit-1]
			out.Cursor = c.cursor("lists", string(last.Authority)+"\x00"+string(last.ID), "status", "authority")
			break
		}
		out.Lists = append(out.Lists, headOf(v, e))
	}
	return c.reply(http.StatusOK, out)
}
