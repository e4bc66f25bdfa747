package plan

import (
	"strings"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Returned says what became of a submitted target in the list that came back.
type Returned uint8

// What can become of a target. The zero value is the one that promises nothing.
const (
	Missing Returned = iota // no region of the list is its
	Moved                   // the region of its name does not surely hold it
	Refused                 // its region is there, and closed whenever the beam could use it
	Cleared                 // its region is there and at some time open
)

var returnedWords = [...]string{"missing", "moved", "refused", "cleared"}

// String returns the word for it.
func (r Returned) String() string {
	if int(r) < len(returnedWords) {
		return returnedWords[r]
	}
	return "unknown"
}

// Reconciled is one submitted target against the list.
type Reconciled struct {
	Target   Target
	Returned Returned
	Region   string   // the list's region; empty where there is none
	Apart    s1.Angle // of Moved and a cone of the sky: how far the target is from its middle; else 0
	Open     span.Set // when this list alone leaves the target open
}

// Reconciliation is every target, and the regions that belong to none: the
// list's own, or targets that nobody submitted.
type Reconciliation struct {
	Targets []Reconciled
	Extra   []string
	Over    span.Span // what was compared: the span as far as the list covers it
}

// RegionName returns the identifier that a target's region has in a list: its
// name, with a hyphen for each character that an identifier cannot have, cut at
// 64 characters.
func RegionName(target string) string {
	name := strings.Map(func(c rune) rune {
		if c >= 'A' && c <= 'Z' || c >= 'a' && c <= 'z' || c >= '0' && c <= '9' || c == '.' || c == '_' || c == '-' {
			return c
		}
		return '-'
	}, target)
	return name[:min(len(name), 64)]
}

// Reconcile compares targets that were submitted with the list that came back,
// over a span that nights cover. A target's region is the one with its
// identifier, or else the narrowest cone or track of the sky that surely holds
// it. The error is a *closures.Error.
func Reconcile(f *closures.Foreseen, beam closures.BeamID, l *closures.List, targets []Target, over span.Span, nights []*sky.Night) (Reconciliation, error) {
	out := Reconciliation{Over: l.Covers().Intersect(over)}
	if out.Over.Empty() {
		return out, closures.Errorf(closures.Invalid, "give a span that the list covers", "reconcile: list %s covers nothing of the span", l)
	}
	if f.Rules.Authority(l.Authority()) == nil {
		return out, closures.Errorf(closures.NotFound, "configure the authority", "reconcile: authority %.64q is not configured", l.Authority())
	}
	if !l.For(beam) {
		return out, closures.Errorf(closures.Conflict, "name a beam that the list is for", "reconcile: list %s is not for beam %.64q", l, beam)
	}
	p, err := Prepare(alone(f, beam, l), beam, out.Over, nights)
	if err != nil {
		return out, err
	}
	regions := l.Text().Regions
	byName := make(map[string]int, len(regions))
	for i := range regions {
		byName[regions[i].ID] = i
	}
	var scratch Scratch
	taken := make([]bool, len(regions))
	for i := range targets {
		one, region, err := p.reconcile(&targets[i], regions, byName, &scratch)
		if err != nil {
			return out, err
		}
		if region >= 0 {
			taken[region] = true
		}
		out.Targets = append(out.Targets, one)
	}
	for i := range regions {
		if s := regions[i].Shape; !taken[i] && (s == closures.ICRSCone || s == closures.TrackCone) {
			out.Extra = append(out.Extra, regions[i].ID)
		}
	}
	return out, nil
}

// alone is what is foreseen if a list were all that closes a beam.
func alone(f *closures.Foreseen, beam closures.BeamID, l *closures.List) *closures.Foreseen {
	r := *f.Rules
	r.Authorities = []closures.AuthorityRules{*r.Authority(l.Authority())}
	r.Neighbours = nil
	b := *r.Beam(beam)
	b.Limits = closures.Limits{ElevationMin: -90 * s1.Degree, ElevationMax: 91 * s1.Degree, SunBelow: 90 * s1.Degree}
	r.Beams = []closures.BeamRules{b}
	return &closures.Foreseen{Rules: &r, Lists: []closures.Listed{{List: l}}, Air: f.Air}
}

func (p *Planner) reconcile(t *Target, regions []closures.Region, byName map[string]int, scratch *Scratch) (Reconciled, int, error) {
	out := Reconciled{Target: *t}
	aim, ok := p.foreseen.Prepared(t.Aim, p.nights)
	if !ok {
		return out, -1, closures.Errorf(closures.Invalid, "give a whole aim with finite numbers", "reconcile: the aim of target %.64q cannot be used", t.Name)
	}
	q := p.question(aim)
	q.Over = p.over
	region, named := byName[RegionName(t.Name)]
	if named {
		if _, must := q.Within(p.foreseen, &regions[region]); !must.Covers(p.over) {
			out.Returned, out.Region = Moved, regions[region].ID
			if at := p.over.From; regions[region].Shape == closures.ICRSCone {
				for _, n := range p.nights {
					if closures.BinOf(n).Contains(at) {
						out.Apart = geometry.Separation(aim.InSkyAt(n, at), regions[region].Direction)
					}
				}
			}
			return out, region, nil
		}
	} else if region = p.narrowest(&q, regions, scratch); region < 0 {
		return out, -1, nil
	}
	out.Region = regions[region].ID
	allowed, err := p.One(aim, scratch)
	if err != nil {
		return out, region, err
	}
	if out.Open = allowed.Spans; len(out.Open) > 0 {
		out.Returned = Cleared
	} else {
		out.Returned = Refused
	}
	return out, region, nil
}

// narrowest returns the index of the narrowest cone or track that surely holds
// the aim over the question's span, or -1.
func (p *Planner) narrowest(q *closures.Question, regions []closures.Region, scratch *Scratch) int {
	best := -1
	try := func(i int) {
		r := &regions[i]
		if r.Shape != closures.ICRSCone && r.Shape != closures.TrackCone || best >= 0 && r.Radius >= regions[best].Radius {
			return
		}
		if _, must := q.Within(p.foreseen, r); must.Covers(q.Over) {
			best = i
		}
	}
	if hits := scratch.hits.Along(p.foreseen, q); hits != nil {
		for _, i := range hits.Regions(0) {
			try(int(i))
		}
		return best
	}
	for i := range regions {
		try(i)
	}
	return best
}
