package api

import (
	"bytes"
	"encoding/json"
	"errors"
	"io"
	"net/http"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/closures/wire"
	"beamward/service/access"
)

// The media types of closure lists. Of the last two the text itself tells.
var listTypes = map[string]listfile.Format{
	"application/yaml": listfile.YAML, "application/x-yaml": listfile.YAML, "text/yaml": listfile.YAML, jsonType: listfile.JSON, "text/csv": listfile.CSV,
	"text/plain": listfile.Auto, "application/octet-stream": listfile.Auto,
}

func listRoutes() []route {
	takes := []string{"application/yaml", jsonType, "text/csv", "text/plain", "application/octet-stream", "application/x-yaml", "text/yaml"}
	format := param{"format", "how the text is written; auto tells from the text. It goes before Content-Type", wordOf("auto", "yaml", "json", "csv")}
	layout := param{"layout", "the layout of the site's config that reads the text, instead of a format", textOf(64)}
	ofPath := "/v1/lists/{authority}/{id}"
	return []route{
		{method: "GET", path: "/v1/lists", id: "lists", summary: "The closure lists that are known", action: access.See,
			query: []param{
				{"status", "only these", wordOf("waiting", "in-force", "replaced", "withdrawn")}, {"authority", "only this authority's", textOf(64)},
				limitParam, cursorParam,
			}, answer: listsDoc{}, serve: (*call).lists},
		{method: "POST", path: "/v1/lists", id: "addList", summary: "Bring a closure list; one bad line refuses it whole", action: access.Act, budget: forWriting,
			query: []param{format, layout}, headers: []param{keyParam}, takes: takes, status: http.StatusCreated, answer: listDoc{}, errors: []int{404, 409}, serve: (*call).addList},
		{method: "POST", path: "/v1/lists/check", id: "checkList", summary: "Say how a closure list would be understood and what it would change; keeps nothing", action: access.See, budget: forWriting,
			query: []param{format, layout}, takes: takes, answer: checkDoc{}, errors: []int{404, 409}, serve: (*call).checkList},
		{method: "GET", path: ofPath, id: "list", summary: "One closure list as it was understood; as YAML or CSV: the list itself", action: access.See,
			gives: []string{jsonType, "application/yaml", "text/csv"}, answer: listDoc{}, serve: (*call).list},
		{method: "POST", path: ofPath + "/confirm", id: "confirmList", summary: "Let a waiting list, or a withdrawal, take effect; by digest or If-Match", action: access.Act, budget: forWriting,
			headers: []param{ifMatchParam, keyParam}, takes: []string{jsonType}, body: confirmBody{}, optional: true, answer: listDoc{}, errors: []int{409, 412}, serve: (*call).confirmList},
		{method: "POST", path: ofPath + "/withdraw", id: "withdrawList", summary: "Take a list out of force, at once or once it is confirmed", action: access.Act, budget: forWriting,
			headers: []param{ifMatchParam, keyParam}, takes: []string{jsonType}, body: withdrawBody{}, optional: true, answer: listDoc{}, errors: []int{409, 412}, serve: (*call).withdrawList},
	}
}

// readList reads the list in the body, in one of the few slots.
func (c *call) readList() (*closures.List, listfile.Report, error) {
	load, err := c.listReader()
	if err != nil {
		return nil, listfile.Report{}, err
	}
	give, err := c.slot()
	if err != nil {
		return nil, listfile.Report{}, err
	}
	defer give()
	body := c.body(c.api.limits.List, c.api.limits.LongTime)
	l, report, err := load(body, listfile.Limits{Bytes: c.api.limits.List})
	if body.err != nil {
		return nil, report, body.err
	}
	var bad *listfile.Refusal
	if errors.As(err, &bad) {
		return nil, report, listRefused(bad)
	}
	return l, report, err
}

// listReader says how the text is read: by a layout, by format=, or as
// Content-Type has it.
func (c *call) listReader() (func(io.Reader, listfile.Limits) (*closures.List, listfile.Report, error), error) {
	if c.has("layout") {
		l := c.api.options.Layouts[c.query.Get("layout")]
		switch {
		case l == nil:
			return nil, badQuery("layout", "no layout of this name is configured", "name one of the config's layouts")
		case c.has("format"):
			return nil, badQuery("format", "a text has a format or a layout", "give one of them")
		}
		return l.Load, nil
	}
	format := listTypes[c.takes()]
	if c.has("format") {
		word, err := c.word("format", "auto", "yaml", "json", "csv")
		if err != nil {
			return nil, err
		}
		format, _ = listfile.ParseFormat(word)
	}
	return func(r io.Reader, limits listfile.Limits) (*closures.List, listfile.Report, error) {
		return listfile.Load(r, format, limits)
	}, nil
}

// listRefused tells every bad line that the reader kept.
func listRefused(bad *listfile.Refusal) *refusal {
	r := refuse(http.StatusUnprocessableEntity, bad.Error(), "")
	r.Title = "closure list refused"
	for _, l := range bad.Lines {
		r.Errors = append(r.Errors, wire.ProblemEntry{Line: l.Line, Detail: l.Cause, Mend: l.Mend, Text: l.Text})
	}
	r.more = struct {
		Type   string              `json:"type"`
		Title  string              `json:"title"`
		Status int                 `json:"status"`
		Detail string              `json:"detail"`
		Total  int                 `json:"bad_total"`
		Errors []wire.ProblemEntry `json:"errors"`
	}{"about:blank", r.Title, r.Status, r.Detail, bad.Total, r.Errors}
	return r
}

func (c *call) addList() error {
	l, _, err := c.readList()
	if err != nil {
		return err
	}
	// What was asked is the list that was understood: the same one in another
	// form is the same request.
	digest := l.Digest()
	return c.once(digest[:], false, func() (int, http.Header, []byte, error) {
		v, _ := c.view()
		same, _, err := v.Book.Offer(v.Rules, l)
		if err != nil {
			return 0, nil, nil, err
		}
		status := http.StatusCreated
		if same {
			status = http.StatusOK
		}
		if err := c.submit(closures.ListOffered{List: l, By: c.who.Name}); err != nil {
			return 0, nil, nil, err
		}
		return c.listAnswer(status, l.Authority(), l.ID())
	})
}

// listAnswer is the list as it now stands.
func (c *call) listAnswer(status int, authority closures.AuthorityID, id closures.ListID) (int, http.Header, []byte, error) {
	v, _ := c.view()
	e := v.Book.Find(authority, id)
	if e == nil {
		return 0, nil, nil, refuse(http.StatusConflict, "the list was changed by somebody else meanwhile", "look again")
	}
	body, err := json.Marshal(c.api.listOf(v, e))
	return status, http.Header{"Location": {"/v1/lists/" + string(authority) + "/" + string(id)}, "Etag": {listTag(e)}}, body, err
}

// theList returns the list that the path names.
func (c *call) theList(v *View) (*closures.Entry, error) {
	e := v.Book.Find(closures.AuthorityID(c.name("authority")), closures.ListID(c.name("id")))
	if e == nil {
		return nil, refuse(http.StatusNotFound, "there is no such list", "see /v1/lists for those that there are")
	}
	return e, nil
}

func (c *call) list() error {
	v, _ := c.view()
	e, err := c.theList(v)
	if err != nil {
		return err
	}
	c.w.Header().Set("ETag", listTag(e))
	give, err := c.slot()
	if err != nil {
		return err
	}
	defer give()
	var out bytes.Buffer
	switch c.gives {
	case "application/yaml":
		err = listfile.WriteYAML(&out, e.List.Text())
	case "text/csv":
		err = listfile.WriteCSV(&out, e.List.Text())
	default:
		return c.reply(http.StatusOK, c.api.listOf(v, e))
	}
	if err != nil {
		return err
	}
	c.longer(c.api.limits.LongTime)
	return c.send(http.StatusOK, c.gives, out.Bytes())
}
