package api

import (
	"net/http"
	"strconv"
	"strings"

	"beamward/closures"
)

type confirmBody struct {
	Digest     string `json:"digest,omitempty" doc:"of the list that was looked at; If-Match does as well"`
	Withdrawal bool   `json:"withdrawal,omitempty" doc:"what is confirmed is that the list is withdrawn, which somebody asked for"`
}

func (c *call) confirmList() error {
	var in confirmBody
	if err := c.read(&in); err != nil {
		return err
	}
	return c.once(c.asked("confirm", in.Digest, strconv.FormatBool(in.Withdrawal)), false, func() (int, http.Header, []byte, error) {
		end, err := c.changing()
		if err != nil {
			return 0, nil, nil, err
		}
		defer end()
		e, digest, err := c.toConfirm(&in)
		if err == nil {
			err = c.submit(closures.ListConfirmed{Authority: e.List.Authority(), ID: e.List.ID(), Digest: digest, By: c.who.Name})
		}
		if err != nil {
			return 0, nil, nil, err
		}
		return c.listAnswer(http.StatusOK, e.List.Authority(), e.List.ID())
	})
}

// asked is what a request to change a list asks for, precondition included.
func (c *call) asked(parts ...string) []byte {
	return []byte(strings.Join(append(parts, c.r.Header.Values("If-Match")...), "\x00"))
}

// changing waits until nobody else confirms or withdraws a list, so that what
// was looked at is what is changed; end lets the next one.
func (c *call) changing() (end func(), err error) {
	c.longer(2*c.api.limits.Durable + c.api.limits.Answer)
	select {
	case c.api.listChange <- struct{}{}:
		return func() { <-c.api.listChange }, nil
	case <-c.r.Context().Done():
		return nil, c.r.Context().Err()
	}
}

// toConfirm returns the list that a person confirms, and the digest of what
// they have looked at. The core confirms whatever waits: the list, or its
// withdrawal. Which of them a person means is therefore asked here.
func (c *call) toConfirm(in *confirmBody) (e *closures.Entry, digest closures.Digest, err error) {
	v, _ := c.view()
	if e, err = c.theList(v); err != nil {
		return nil, digest, err
	}
	matched, err := c.ifMatch(listTag(e))
	if err != nil {
		return nil, digest, err
	}
	digest = e.List.Digest()
	switch {
	case in.Digest != "":
		if digest, err = closures.ParseDigest(in.Digest); err != nil {
			return nil, digest, wrong("/digest", "it is no digest", "give sha256: and 64 lower-case hexadecimal digits, as the list's document has it")
		}
	case !matched:
		return nil, digest, refuse(http.StatusBadRequest, "it is not said which list was looked at", "give its digest, or its ETag in If-Match")
	}
	leaving := e.Asked != "" && e.Status != closures.ListGone
	switch {
	case in.Withdrawal && !leaving:
		return nil, digest, refuse(http.StatusConflict, "no withdrawal of the list waits for confirmation", "look at the list again")
	case leaving && !in.Withdrawal && !matched:
		return nil, digest, refuse(http.StatusConflict, "somebody asked to withdraw the list, and a confirmation would do that", "look at the list again; to have it withdrawn, confirm with withdrawal: true")
	case v.loosening(e) != closures.LooseningSecondPerson:
		return e, digest, nil
	case leaving:
		return e, digest, c.second(e.Asked)
	}
	return e, digest, c.second(e.By)
}

// loosening is what the list's authority asks of what loosens; the most where
// the authority is no longer configured.
func (v *View) loosening(e *closures.Entry) closures.Loosening {
	if a := v.Rules.Authority(e.List.Authority()); a != nil {
		return a.Loosening
	}
	return closures.LooseningSecondPerson
}

type withdrawBody struct {
	Reference string `json:"reference,omitempty" maxLength:"200" doc:"the authority's own"`
}

func (c *call) withdrawList() error {
	var in withdrawBody
	if err := c.read(&in); err != nil {
		return err
	}
	if err := checkText("/reference", in.Reference, 0, 200); err != nil {
		return err
	}
	return c.once(c.asked("withdraw", in.Reference), false, func() (int, http.Header, []byte, error) {
		end, err := c.changing()
		if err != nil {
			return 0, nil, nil, err
		}
		defer end()
		v, _ := c.view()
		e, err := c.theList(v)
		if err == nil {
			_, err = c.ifMatch(listTag(e))
		}
		if err == nil && v.loosening(e) == closures.LooseningSecondPerson && !c.who.Token {
			err = c.second("")
		}
		if err == nil {
			err = c.submit(closures.ListWithdrawn{Authority: e.List.Authority(), ID: e.List.ID(), By: c.who.Name, Reference: in.Reference})
		}
		if err != nil {
			return 0, nil, nil, err
		}
		return c.listAnswer(http.StatusOK, e.List.Authority(), e.List.ID())
	})
}
