package api

import (
	"bufio"
	"errors"
	"net/http"
	"time"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/closures/wire"
	"beamward/service/access"
	"beamward/service/render"
)

const (
	ndjson   = "application/x-ndjson"
	calendar = "text/calendar"
	csvType  = "text/csv"
)

var (
	fromParam   = param{"from", "start; now where absent", timeOf()}
	untilParam  = param{"until", "end, at most 14 days after from", timeOf()}
	formatParam = param{"format", "instead of Accept", wordOf("json", "ndjson", "csv", "ics")}
)

var formats = map[string]string{"json": jsonType, "ndjson": ndjson, "csv": csvType, "ics": calendar}

func planRoutes() []route {
	return []route{
		{method: "POST", path: "/v1/plan", id: "plan", summary: "When each target is allowed, and what stands against it; streamed in the order of the table", action: access.See, budget: forWriting,
			query: []param{{"beam", "the beam to plan for", textOf(64)}, fromParam, untilParam, formatParam},
			takes: []string{csvType, jsonType}, body: []targetBody{}, gives: []string{jsonType, ndjson, csvType, calendar}, answer: planDoc{}, errors: []int{404}, serve: (*call).plan},
		{method: "GET", path: "/v1/beams/{beam}/outlook", id: "outlook", summary: "What is to come for the present aim", action: access.See,
			query: []param{{"hours", "how far to look; 12 where absent", numberOf(0.01, 48)}}, answer: outlookDoc{}, serve: (*call).outlook},
	}
}

// targetBody is one target of a table in JSON, as the document shows it; the
// planner's own reader reads it. It is a direction (ICRS, with a proper motion
// or a rate), a local direction, or a table.
type targetBody struct {
	Name      string      `json:"name" minLength:"1" maxLength:"128"`
	RA        *float64    `json:"ra_deg,omitempty" minimum:"0" maximum:"360"`
	Dec       *float64    `json:"dec_deg,omitempty" minimum:"-90" maximum:"90"`
	PMRA      *float64    `json:"pm_ra_mas_yr,omitempty" doc:"on the sky, times cos(dec)"`
	PMDec     *float64    `json:"pm_dec_mas_yr,omitempty"`
	RateRA    *float64    `json:"rate_ra_arcsec_s,omitempty" doc:"on the sky, times cos(dec)"`
	RateDec   *float64    `json:"rate_dec_arcsec_s,omitempty"`
	RateAt    *time.Time  `json:"rate_at,omitempty" doc:"when it is at ra_deg and dec_deg"`
	Az        *float64    `json:"az_deg,omitempty" minimum:"0" maximum:"360"`
	El        *float64    `json:"el_deg,omitempty" minimum:"-90" maximum:"90"`
	Refracted *bool       `json:"refracted,omitempty" doc:"of a local direction: as seen through the air"`
	Table     []pointBody `json:"table,omitempty" doc:"where it is at instants; nowhere outside them"`
	Length    *float64    `json:"length_s,omitempty"`
	Priority  *float64    `json:"priority,omitempty"`
	MinSpan   *float64    `json:"min_span_s,omitempty"`
	Reacquire *float64    `json:"reacquire_s,omitempty"`
}

// PlanHead says what a plan is for. It stands before the targets.
type PlanHead struct {
	Beam        closures.BeamID `json:"beam"`
	From        time.Time       `json:"from"`
	Until       time.Time       `json:"until"`
	RulesDigest string          `json:"rules_digest"`
	ListsDigest string          `json:"lists_digest"`
	LeftOut     []string        `json:"left_out" doc:"reasons that no plan can foresee"`
	Notice      string          `json:"notice"`
}

type planDoc struct {
	PlanHead
	Targets []targetDoc `json:"targets"`
}

// targetDoc is what one target can have.
type targetDoc struct {
	Name     string         `json:"name"`
	Allowed  []spanDoc      `json:"allowed"`
	AllowedS float64        `json:"allowed_s"`
	Usable   []spanDoc      `json:"usable" doc:"of the allowed spans, less the time to acquire, those that are long enough for the target"`
	Blocked  []closureDoc   `json:"blocked"`
	Cautions []wire.Caution `json:"cautions"`
	Error    string         `json:"error,omitempty" doc:"it could not be planned, and is allowed at no time"`
}

func leftOut() []string { return (closures.AllCodes &^ closures.ForeseeableCodes()).Names() }

func targetOf(name string, p *planned) targetDoc {
	out := targetDoc{Name: name, Allowed: []spanDoc{}, Usable: []spanDoc{}, Blocked: []closureDoc{}, Cautions: []wire.Caution{}}
	if p.err != nil {
		r, _ := refusalOf(p.err)
		out.Error = r.Detail
		return out
	}
	out.Allowed, out.AllowedS, out.Usable = spansOf(p.Spans), p.Spans.Total().Seconds(), spansOf(p.Usable)
	for i := range p.Blocked {
		it := itemOf("", &p.Blocked[i])
		out.Blocked = append(out.Blocked, closureOf(&it))
	}
	for i := range p.Cautions {
		out.Cautions = append(out.Cautions, wire.CautionOf(&p.Cautions[i]))
	}
	return out
}

// chosen is the media type of the answer: that of format=, where it is given.
func (c *call) chosen(words ...string) (string, error) {
	if !c.has("format") {
		return c.gives, nil
	}
	word, err := c.word("format", words...)
	return formats[word], err
}

func (c *call) plan() error {
	media, err := c.chosen("json", "ndjson", "csv", "ics")
	if err != nil {
		return err
	}
	over, err := c.over(12 * time.Hour)
	if err != nil {
		return err
	}
	if !c.has("beam") {
		return badQuery("beam", "it is not said for which beam", "give beam=")
	}
	v, _ := c.view()
	beam := closures.BeamID(c.query.Get("beam"))
	if v.Rules.Beam(beam) == nil {
		return refuse(http.StatusNotFound, "no beam of this name is configured", "see /v1/beams for those that are")
	}
	give, err := c.slot()
	if err != nil {
		return err
	}
	defer give()
	body := c.body(c.api.limits.Targets, c.api.limits.LongTime)
	targets, err := plan.ReadTargets(body)
	switch {
	case body.err != nil:
		return body.err
	case err != nil:
		return targetsRefused(err)
	}
	c.longer(c.api.limits.Answer)
	p, err := c.prepare(v, beam, over)
	if err != nil {
		return err
	}
	head := PlanHead{
		Beam: beam, From: over.From, Until: over.Until, RulesDigest: v.Rules.Digest.String(), ListsDigest: v.Book.Digest().String(), LeftOut: leftOut(), Notice: render.Notice,
	}
	out := planWriter{c: c, media: media, out: bufio.NewWriterSize(c.w, 32<<10)}
	out.begin(&head)
	if err := each(p, targets, func(i int, t *planned) error { return out.target(&targets[i], t) }); err == nil {
		err = out.end(len(targets))
		if err == nil {
			return nil
		}
	}
	// The status is out. A cut connection tells the client that this is not all.
	panic(http.ErrAbortHandler)
}

func targetsRefused(err error) error {
	var bad *plan.Refusal
	if !errors.As(err, &bad) {
		return err
	}
	r := refuse(http.StatusUnprocessableEntity, bad.Error(), "")
	r.Title = "targets refused"
	for _, row := range bad.Rows {
		r.Errors = append(r.Errors, wire.ProblemEntry{Line: row.Line, Detail: row.Cause, Mend: row.Mend, Text: row.Text})
	}
	return r
}
