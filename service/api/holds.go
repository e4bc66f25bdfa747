package api

import (
	"crypto/rand"
	"encoding/json"
	"io"
	"net/http"
	"strings"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/access"
)

var keyParam = param{"Idempotency-Key", "sent again with the same key, the request is answered as before and does nothing again; kept for 24 h in memory", textOf(255)}

func holdRoutes() []route {
	return []route{
		{method: "GET", path: "/v1/holds", id: "holds", summary: "The holds that are placed", action: access.See, answer: holdsDoc{}, serve: (*call).holds},
		{method: "GET", path: "/v1/holds/{id}", id: "hold", summary: "One hold", action: access.See, answer: holdDoc{}, serve: (*call).hold},
		{method: "POST", path: "/v1/holds", id: "placeHold", summary: "Shutter a beam, or every beam: at once, and answered once it is on record", action: access.Shutter, budget: forHolding,
			headers: []param{keyParam}, takes: []string{jsonType}, body: holdBody{}, status: http.StatusCreated, answer: holdDoc{}, errors: []int{404, 409}, serve: (*call).placeHold},
		{method: "POST", path: "/v1/holds/{id}/release", id: "releaseHold", summary: "End a hold; an authority's is released by a second person with a reference", action: access.Act, budget: forWriting,
			headers: []param{ifMatchParam}, takes: []string{jsonType}, body: releaseBody{}, optional: true, answer: releasedDoc{}, errors: []int{409, 412}, serve: (*call).releaseHold},
	}
}

// holdBody is a hold to be placed.
type holdBody struct {
	Beam     string      `json:"beam" doc:"a beam, or * for every beam"`
	Reason   string      `json:"reason" minLength:"1" maxLength:"500"`
	By       string      `json:"by,omitempty" doc:"the name that the token has; it may be left out"`
	From     *time.Time  `json:"from,omitempty" doc:"absent: at once"`
	Until    *time.Time  `json:"until,omitempty" doc:"absent: until released"`
	Region   *regionBody `json:"region,omitempty" doc:"absent: the whole sky"`
	Order    string      `json:"order,omitempty" enum:"site,authority" doc:"whose order it is; site where absent"`
	Caller   string      `json:"caller,omitempty" maxLength:"200" doc:"who called"`
	CallBack string      `json:"call_back,omitempty" maxLength:"200" doc:"where they can be called back"`
}

// holdDoc is a hold.
type holdDoc struct {
	ID       closures.HoldID `json:"id"`
	Beam     closures.BeamID `json:"beam"`
	Reason   string          `json:"reason"`
	By       string          `json:"by"`
	Placed   time.Time       `json:"placed"`
	From     time.Time       `json:"from"`
	Until    *time.Time      `json:"until" doc:"null: until released"`
	Region   *regionBody     `json:"region" doc:"null: the whole sky"`
	Order    string          `json:"order" doc:"site or authority"`
	Caller   string          `json:"caller"`
	CallBack string          `json:"call_back"`
	Now      bool            `json:"now" doc:"it applies at this moment"`
	ETag     string          `json:"etag"`
}

type holdsDoc struct {
	Holds []holdDoc `json:"holds"`
}

func holdOf(h *closures.HoldPlaced, at time.Time) holdDoc {
	s := h.Span()
	out := holdDoc{
		ID: h.ID, Beam: h.Beam, Reason: h.Reason, By: h.By, Placed: h.Placed.UTC(), From: s.From.UTC(), Until: wire.Instant(h.Until),
		Region: regionOf(h.Region), Order: "site", Caller: h.Caller, CallBack: h.CallBack, Now: s.Contains(at), ETag: holdTag(h),
	}
	if h.Until.IsZero() {
		out.Until = nil
	}
	if h.Authority {
		out.Order = "authority"
	}
	return out
}

func (c *call) holds() error {
	v, _ := c.view()
	out := holdsDoc{Holds: []holdDoc{}}
	for i := range v.Holds {
		out.Holds = append(out.Holds, holdOf(&v.Holds[i], c.wall()))
	}
	return c.reply(http.StatusOK, out)
}

// theHold returns the hold that the path names.
func (c *call) theHold(v *View) (*closures.HoldPlaced, error) {
	id := closures.HoldID(c.name("id"))
	for i := range v.Holds {
		if v.Holds[i].ID == id {
			return &v.Holds[i], nil
		}
	}
	return nil, refuse(http.StatusNotFound, "there is no hold of this id", "see /v1/holds for those that there are")
}

func (c *call) hold() error {
	v, _ := c.view()
	h, err := c.theHold(v)
	if err != nil {
		return err
	}
	c.w.Header().Set("ETag", holdTag(h))
	return c.reply(http.StatusOK, holdOf(h, c.wall()))
}

func (c *call) placeHold() error {
	data, err := io.ReadAll(c.body(c.api.limits.Body, c.api.limits.BodyTime))
	if err != nil {
		return err
	}
	var in holdBody
	if err := decode(data, &in); err != nil {
		return err
	}
	h, err := c.holdFrom(&in)
	if err != nil {
		return err
	}
	// A hold is never refused for its key: one that was used for another hold
	// places this one all the same.
	return c.once(data, true, func() (int, http.Header, []byte, error) {
		if err := c.submit(h); err != nil {
			return 0, nil, nil, err
		}
		doc := holdOf(&h, c.wall())
		body, err := json.Marshal(doc)
		return http.StatusCreated, http.Header{"Location": {"/v1/holds/" + string(h.ID)}, "Etag": {doc.ETag}}, body, err
	})
}

// holdFrom makes a hold of what was sent.
func (c *call) holdFrom(in *holdBody) (h closures.HoldPlaced, err error) {
	h = closures.HoldPlaced{
		ID: newHoldID(), Beam: closures.BeamID(in.Beam), Reason: in.Reason, By: c.who.Name, Placed: c.wall(), Caller: in.Caller, CallBack: in.CallBack,
		Authority: in.Order == "authority",
	}
	if in.Order != "" && in.Order != "site" && in.Order != "authority" {
		return h, wrong("/order", "it is none of the words that it can be", "use site or authority")
	}
	if in.By != "" && in.By != c.who.Name {
		return h, wrong("/by", "it is not your own name", "leave it out: the name of your token stands on record")
	}
	if h.Beam != closures.EveryBeam && !closures.ValidName(in.Beam) {
		return h, wrong("/beam", "it is not the name of a beam", "give a configured beam, or * for every beam")
	}
	if err := checkText("/reason", in.Reason, 1, 500); err != nil {
		return h, err
	}
	if err := checkText("/caller", in.Caller, 0, 200); err != nil {
		return h, err
	}
	if err := checkText("/call_back", in.CallBack, 0, 200); err != nil {
		return h, err
	}
	if in.From != nil {
		h.From = *in.From
	}
	if in.Until != nil {
		h.Until = *in.Until
	}
	if in.Until != nil && !h.Until.After(h.Placed) {
		return h, wrong("/until", "it is past: the hold would hold at no time", "give a time to come, or leave it out")
	}
	if in.Region != nil {
		h.Region, err = in.Region.region("/region")
	}
	return h, err
}

// newHoldID makes a name that nobody has used: 80 random bits.
func newHoldID() closures.HoldID {
	return closures.HoldID("h-" + strings.ToLower(rand.Text()[:16]))
}

type releaseBody struct {
	Reference string `json:"reference,omitempty" maxLength:"200" doc:"the authority's own, for its orders"`
}

type releasedDoc struct {
	Released closures.HoldID `json:"released"`
}

func (c *call) releaseHold() error {
	v, _ := c.view()
	h, err := c.theHold(v)
	if err != nil {
		return err
	}
	if _, err := c.ifMatch(holdTag(h)); err != nil {
		return err
	}
	var in releaseBody
	if err := c.read(&in); err != nil {
		return err
	}
	if err := checkText("/reference", in.Reference, 0, 200); err != nil {
		return err
	}
	if h.Authority {
		if err := c.second(h.By); err != nil {
			return err
		}
	}
	release := closures.HoldReleased{ID: h.ID, By: c.who.Name, Reference: in.Reference}
	if err := closures.CheckRelease(v.Holds, release); err != nil {
		return err
	}
	if err := c.submit(release); err != nil {
		return err
	}
	return c.reply(http.StatusOK, releasedDoc{h.ID})
}

// second refuses whoever cannot be the second person after first: who did the
// first thing themselves, and whoever has no name of their own.
func (c *call) second(first string) error {
	if !c.who.Token {
		return refuse(http.StatusConflict, "this asks for a second person, and nobody signs in by name here", "give each person a token")
	}
	if strings.EqualFold(c.who.Name, first) {
		return refuse(http.StatusConflict, "this asks for a second person, and you are the first", "let somebody else do it")
	}
	return nil
}
