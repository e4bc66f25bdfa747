package api

import (
	"net/http"
	"time"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/closures/wire"
	"beamward/geometry/span"
)

// outlookDoc is what is to come for the present aim.
type outlookDoc struct {
	Beam     closures.BeamID `json:"beam"`
	AimKnown bool            `json:"aim_known" doc:"false: nothing can be said, and nothing is allowed"`
	Target   string          `json:"target"`
	From     time.Time       `json:"from"`
	Until    time.Time       `json:"until"`
	Allowed  []spanDoc       `json:"allowed"`
	Closures []closureDoc    `json:"closures"`
	Cautions []wire.Caution  `json:"cautions"`
	LeftOut  []string        `json:"left_out" doc:"reasons that cannot be foreseen"`
}

func (c *call) outlook() error {
	v, _ := c.view()
	r, _, err := c.theBeam(v)
	if err != nil {
		return err
	}
	hours, err := c.number("hours", 0.01, 48, 12)
	if err != nil {
		return err
	}
	from := c.wall().UTC()
	over := span.Span{From: from, Until: from.Add(time.Duration(hours * float64(time.Hour)))}
	k := v.known(r.ID)
	out := outlookDoc{Beam: r.ID, Target: k.Aim.Target, From: over.From, Until: over.Until, Allowed: []spanDoc{}, Closures: []closureDoc{}, Cautions: []wire.Caution{}, LeftOut: leftOut()}
	if k.AimUsed == nil {
		return c.reply(http.StatusOK, out)
	}
	give, err := c.slot()
	if err != nil {
		return err
	}
	defer give()
	p, err := c.prepare(v, r.ID, over)
	if err != nil {
		return err
	}
	one := planned{}
	if one.Allowed, err = p.One(k.AimUsed, &plan.Scratch{}); err != nil {
		return err
	}
	t := targetOf("", &one)
	out.AimKnown, out.Allowed, out.Closures, out.Cautions = true, t.Allowed, t.Blocked, t.Cautions
	return c.reply(http.StatusOK, out)
}
