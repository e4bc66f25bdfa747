package api

import (
	"net/http"

	"beamward/closures"
)

type rearmBody struct {
	Note string `json:"note,omitempty" maxLength:"500"`
}

type rearmDoc struct {
	Beams []beamState `json:"beams" doc:"those that were re-armed, as they are now"`
}

func (c *call) rearm() error {
	v, _ := c.view()
	id := closures.BeamID(c.name("beam"))
	if id == closures.EveryBeam {
		if len(c.r.Header.Values("If-Match")) > 0 {
			return badQuery("If-Match", "every beam has no one state to be held against", "re-arm one beam, or leave it out")
		}
	} else {
		_, b, err := c.theBeam(v)
		if err != nil {
			return err
		}
		if _, err := c.ifMatch(beamTag(v, b)); err != nil {
			return err
		}
	}
	var in rearmBody
	if err := c.read(&in); err != nil {
		return err
	}
	if err := checkText("/note", in.Note, 0, 500); err != nil {
		return err
	}
	if err := c.submit(closures.Rearmed{Beam: id, By: c.who.Name, Note: in.Note}); err != nil {
		return err
	}
	v, fresh := c.view()
	out := rearmDoc{Beams: []beamState{}}
	for i := range v.Beams {
		if b := &v.Beams[i]; id == closures.EveryBeam || b.Decision.Beam == id {
			out.Beams = append(out.Beams, stateOf(v, b, fresh))
		}
	}
	return c.reply(http.StatusOK, out)
}
