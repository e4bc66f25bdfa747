package simulate

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/service/config"
	"beamward/service/engine"
)

// reaches reports whether the daemon answers.
func (n *night) reaches() bool { return n.daemon != nil && !n.now().Before(n.stall) }

// tells says one thing to the daemon. done is called once it was acknowledged:
// then people rely on it. A word that stands already counts as acknowledged.
func (n *night) tells(ctx context.Context, who closures.Source, body closures.Body, done func()) (again bool, err error) {
	if !n.reaches() {
		return true, nil
	}
	err = n.daemon.tell(ctx, who, body, true)
	var e *closures.Error
	switch {
	case err == nil:
		done()
	case errors.As(err, &e):
		n.result.Refused = append(n.result.Refused, fmt.Sprintf("%v: %v", n.now().Sub(n.start), err))
		if e.Code == closures.Conflict {
			done()
		}
	default:
		return false, err
	}
	return false, nil
}

type deed = func(ctx context.Context) (again bool, err error)

func (n *night) brings(id closures.ListID) deed {
	return func(ctx context.Context) (bool, error) {
		l := n.lists[id]
		return n.tells(ctx, "desk-1", closures.ListOffered{List: l, By: "desk-1"}, func() {
			n.judge.told.lists = append(n.judge.told.lists, &toldList{text: l.Text(), known: n.now()})
		})
	}
}

func (n *night) confirms(id closures.ListID) deed {
	return func(ctx context.Context) (bool, error) {
		l := n.lists[id]
		return n.tells(ctx, "desk-2", closures.ListConfirmed{Authority: l.Authority(), ID: id, Digest: l.Digest(), By: "desk-2"}, func() {
			for _, o := range n.judge.told.lists {
				if o.text.ID == id {
					o.confirmed = true
					n.retire(o)
				}
			}
		})
	}
}

// retire has the judge drop what a confirmed list replaces.
func (n *night) retire(l *toldList) {
	for _, id := range l.text.Replaces {
		for _, o := range n.judge.told.lists {
			if o.text.ID == id {
				o.gone = true
				n.retire(o)
			}
		}
	}
}

// withdraws takes a list away, and with it what it replaced.
func (n *night) withdraws(id closures.ListID) deed {
	return func(ctx context.Context) (bool, error) {
		l := n.lists[id]
		return n.tells(ctx, "desk-1", closures.ListWithdrawn{Authority: l.Authority(), ID: id, By: "desk-1", ConfirmedBy: "desk-2", Reference: "by telephone"}, func() {
			n.judge.told.uncovered = n.now()
			for _, o := range n.judge.told.lists {
				if o.text.ID == id {
					o.gone = true
					n.retire(o)
				}
			}
		})
	}
}

func (n *night) holds(h closures.HoldPlaced) deed {
	return func(ctx context.Context) (bool, error) {
		h.Placed = n.now()
		return n.tells(ctx, "operator", h, func() {
			if n.judge.told.holds[h.ID] == nil {
				n.judge.told.holds[h.ID] = &toldHold{beam: h.Beam, from: h.Span().From, until: h.Until, known: n.now()}
			}
		})
	}
}

func (n *night) releases(id closures.HoldID) deed {
	return func(ctx context.Context) (bool, error) {
		if n.judge.told.holds[id] == nil {
			return true, nil // whoever placed it is not answered yet
		}
		return n.tells(ctx, "operator", closures.HoldReleased{ID: id, By: "second", Reference: "by telephone"}, func() { delete(n.judge.told.holds, id) })
	}
}

func (n *night) sees(s closures.Sighted) deed {
	return func(ctx context.Context) (bool, error) {
		if s.Said.IsZero() {
			s.Said = n.now()
		}
		return n.tells(ctx, "spotter-east", s, func() { n.judge.told.sightings = append(n.judge.told.sightings, toldSighting{s, n.now()}) })
	}
}

// orders draws what people say of themselves.
func (n *night) orders() {
	beams := [...]closures.BeamID{"north", "south", closures.EveryBeam}
	for i := range n.often(4 * time.Minute) {
		h := closures.HoldPlaced{ID: closures.HoldID(fmt.Sprintf("hold-%d", i)), Beam: beams[n.rng.IntN(3)], Reason: "somebody asked", By: "operator"}
		when := n.some()
		if n.rng.IntN(2) == 0 {
			h.Authority, h.Caller, h.CallBack = true, "the desk", "+00 000 0000"
		}
		switch n.rng.IntN(3) {
		case 0: // for a time to come
			h.From = when.Add(n.lasting(5*time.Second, 2*time.Minute))
			h.Until = h.From.Add(n.lasting(5*time.Second, time.Minute))
		case 1:
			h.Until = when.Add(n.lasting(5*time.Second, 2*time.Minute))
		default:
			n.at(when.Add(n.lasting(5*time.Second, 4*time.Minute)), n.releases(h.ID))
		}
		n.at(when, n.holds(h))
	}
	for range n.often(5 * time.Minute) {
		s := closures.Sighted{Source: "spotter-east", For: n.lasting(20*time.Second, 90*time.Second), Spread: 10 * s1.Degree}
		if n.rng.IntN(3) > 0 {
			s.HasDirection = true
			s.Direction = geometry.FromHorizon(s1.Angle(n.uniform(0, 360))*s1.Degree, s1.Angle(n.uniform(20, 80))*s1.Degree)
		}
		n.at(n.some(), n.sees(s))
	}
}

// reloads puts a configuration in force. One that loosens was confirmed by a
// second person before.
func (n *night) reloads(lead time.Duration) deed {
	return func(ctx context.Context) (bool, error) {
		cfg, err := config.Parse(siteOf(lead, n.opt.Broken), "/")
		if err != nil {
			return false, err
		}
		if !n.reaches() {
			return true, nil
		}
		if err := n.daemon.journal.PutList(cfg.Rules.Digest.String(), cfg.Canonical()); err != nil {
			return false, err
		}
		return n.tells(ctx, "admin", closures.RulesSet{Rules: cfg.Rules, By: "admin"}, func() {
			n.cfg = cfg
			n.result.Reloads++
			n.judge.told.lead, n.judge.told.leadKnown = lead, n.now()
		})
	}
}

// rearm has an operator look at a beam that waits for nothing else.
func (n *night) rearm(ctx context.Context, v *engine.View) error {
	now := n.now()
	for i := range v.Beams {
		d := v.Beams[i].Decision
		if !d.Codes.Has(closures.CodeRearm) || d.Codes.Without(closures.CodeRearm).Without(closures.CodeReopening) != 0 {
			delete(n.rearms, d.Beam)
			continue
		}
		switch due, asked := n.rearms[d.Beam]; {
		case !asked:
			n.rearms[d.Beam] = now.Add(n.lasting(5*time.Second, 15*time.Second))
		case !now.Before(due):
			delete(n.rearms, d.Beam)
			if _, err := n.tells(ctx, "operator", closures.Rearmed{Beam: d.Beam, By: "operator", Note: "looked at"}, func() {}); err != nil {
				return err
			}
		}
	}
	return nil
}
