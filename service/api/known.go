package api

import (
	"cmp"
	"net/http"
	"slices"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/service/access"
)

func knownRoutes() []route {
	return []route{
		{method: "GET", path: "/v1/sources", id: "sources", summary: "Each source of facts: its age and what it proves", action: access.See, answer: sourcesDoc{}, serve: (*call).sources},
		{method: "GET", path: "/v1/aircraft", id: "aircraft", summary: "The aircraft that are known", action: access.See, query: []param{limitParam, cursorParam}, answer: aircraftDoc{}, serve: (*call).aircraft},
		{method: "GET", path: "/v1/neighbours", id: "neighbours", summary: "Where the neighbour telescopes point", action: access.See, answer: neighboursDoc{}, serve: (*call).neighbours},
	}
}

type sourcesDoc struct {
	At      time.Time   `json:"at"`
	Sources []sourceDoc `json:"sources"`
}

// sourceDoc is what is known of one source.
type sourceDoc struct {
	ID          closures.Source `json:"id"`
	Kind        string          `json:"kind"`
	Required    bool            `json:"required"`
	State       string          `json:"state" enum:"heard,silent,warming-up,not-receiving" doc:"silent also where it was never heard"`
	SaidAt      *time.Time      `json:"said_at"`
	HeardAt     *time.Time      `json:"heard_at"`
	Since       *time.Time      `json:"since" doc:"of unbroken hearing"`
	AgeS        *float64        `json:"age_s" doc:"null: never heard"`
	StaleAfterS float64         `json:"stale_after_s"`
	PerMinute   *float64        `json:"messages_per_min"`
	Safe        *bool           `json:"safe" doc:"of an interlock: its newest word"`
}

func sourcesOf(v *View) []sourceDoc {
	out := []sourceDoc{}
	if v.Known == nil {
		return out
	}
	for i := range v.Known.Sources {
		s := &v.Known.Sources[i]
		d := sourceDoc{
			ID: s.Source, Kind: s.Kind.String(), Required: s.Required, State: "heard", SaidAt: wire.Instant(s.Said), HeardAt: wire.Instant(s.Heard),
			Since: wire.Instant(s.Since), AgeS: ageOf(v.Known.At, s.Said, s.Heard), StaleAfterS: s.Limit.Seconds(), PerMinute: finite(s.PerMinute),
		}
		switch {
		case s.Heard.IsZero() || s.Silent:
			d.State = "silent"
		case !s.Receives:
			d.State = "not-receiving"
		case !s.Warm:
			d.State = "warming-up"
		}
		if s.Kind == closures.InterlockSource && !s.Heard.IsZero() {
			safe := s.Interlock.Safe && d.State == "heard"
			d.Safe = &safe
		}
		out = append(out, d)
	}
	return out
}

// knownAt is the instant for which what is known was copied.
func (v *View) knownAt() time.Time {
	if v.Known == nil {
		return v.At
	}
	return v.Known.At
}

func (c *call) sources() error {
	v, _ := c.view()
	return c.reply(http.StatusOK, sourcesDoc{At: v.knownAt().UTC(), Sources: sourcesOf(v)})
}

type aircraftDoc struct {
	At       time.Time  `json:"at"`
	Total    int        `json:"total"`
	Popups   uint64     `json:"popups" doc:"aircraft first reported where they could already touch a beam"`
	Aircraft []craftDoc `json:"aircraft"`
	Cursor   string     `json:"cursor" doc:"for the next page; empty: there is none"`
}

// craftDoc is one aircraft as one source knows it.
type craftDoc struct {
	Aircraft     string          `json:"aircraft"`
	Source       closures.Source `json:"source"`
	SaidAt       *time.Time      `json:"said_at"`
	AgeS         *float64        `json:"age_s"`
	Located      bool            `json:"located"`
	Unclear      bool            `json:"unclear" doc:"its reports contradict each other: it could be anywhere"`
	Inside       bool            `json:"inside" doc:"last seen within the detection range"`
	Popup        bool            `json:"popup"`
	OnGround     bool            `json:"on_ground"`
	Drill        bool            `json:"drill" doc:"simulated, and can only close"`
	Lat          *float64        `json:"lat_deg"`
	Lon          *float64        `json:"lon_deg"`
	AltitudeM    *float64        `json:"altitude_m"`
	AltitudeFrom string          `json:"altitude_from" doc:"ellipsoid, mean_sea_level or pressure; empty: not said"`
	Az           *float64        `json:"az_deg" doc:"from the site; by the altitude as it was given"`
	El           *float64        `json:"el_deg"`
	RangeM       *float64        `json:"range_m"`
	SpeedMPS     *float64        `json:"speed_mps"`
	TrackDeg     *float64        `json:"track_deg"`
	ClimbMPS     *float64        `json:"climb_mps"`
}

func altitudeWord(a closures.AltitudeFrom) string {
	switch a {
	case closures.AboveEllipsoid:
		return "ellipsoid"
	case closures.AboveMeanSeaLevel:
		return "mean_sea_level"
	case closures.PressureAltitude:
		return "pressure"
	}
	return ""
}

func craftOf(k *closures.AircraftKnown, at time.Time, site earth.Frame) craftDoc {
	s := &k.Seen
	out := craftDoc{
		Aircraft: k.Aircraft, Source: k.Source, SaidAt: wire.Instant(s.Said), AgeS: ageOf(at, s.Said, k.Heard), Located: k.Located, Unclear: k.Unclear,
		Inside: k.Inside, Popup: k.Popup, OnGround: s.OnGround, Drill: s.Drill, AltitudeFrom: altitudeWord(s.AltitudeFrom),
		SpeedMPS: finite(float64(s.Speed)), TrackDeg: finite(s.Track.Degrees()), ClimbMPS: finite(float64(s.Climb)),
	}
	if !s.Located {
		return out
	}
	out.Lat, out.Lon, out.AltitudeM = finite(s.Position.Lat.Degrees()), finite(s.Position.Lon.Degrees()), finite(float64(s.Position.Height))
	if geometry.Finite(s.Position.Lat.Radians(), s.Position.Lon.Radians(), float64(s.Position.Height)) {
		seen := site.Sight(s.Position)
		out.Az, out.El, out.RangeM = finite(seen.Az.Degrees()), finite(seen.El.Degrees()), finite(float64(seen.Range))
	}
	return out
}

func (c *call) aircraft() error {
	limit, after, err := c.page("aircraft")
	if err != nil {
		return err
	}
	v, _ := c.view()
	out := aircraftDoc{At: v.knownAt().UTC(), Aircraft: []craftDoc{}}
	if v.Known == nil {
		return c.reply(http.StatusOK, out)
	}
	out.Total, out.Popups = len(v.Known.Aircraft), v.Known.Popups
	key := func(k *closures.AircraftKnown) string { return k.Aircraft + "\x00" + string(k.Source) }
	var found []*closures.AircraftKnown
	for i := range v.Known.Aircraft {
		if k := &v.Known.Aircraft[i]; after == "" || key(k) > after {
			found = append(found, k)
		}
	}
	slices.SortFunc(found, func(a, b *closures.AircraftKnown) int { return cmp.Compare(key(a), key(b)) })
	site := earth.FrameAt(v.Rules.Site.Position)
	for i, k := range found {
		if i == limit {
			out.Cursor = c.cursor("aircraft", key(found[limit-1]))
			break
		}
		out.Aircraft = append(out.Aircraft, craftOf(k, v.Known.At, site))
	}
	return c.reply(http.StatusOK, out)
}

type neighboursDoc struct {
	At         time.Time      `json:"at"`
	Neighbours []neighbourDoc `json:"neighbours"`
}

// neighbourDoc is what is known of a neighbour telescope. Angles are airless,
// and seen from the site.
type neighbourDoc struct {
	ID           closures.TelescopeID `json:"id"`
	State        string               `json:"state" enum:"heard,silent" doc:"silent also where it was never heard"`
	SaidAt       *time.Time           `json:"said_at"`
	AgeS         *float64             `json:"age_s"`
	StaleAfterS  float64              `json:"stale_after_s"`
	ForgetAfterS float64              `json:"forget_after_s" doc:"until then its last aim counts"`
	WhenSilent   string               `json:"when_silent" enum:"shutter,ignore"`
	Yields       string               `json:"yields" enum:"ours,theirs,later"`
	ICRS         *equatorDoc          `json:"icrs"`
	Horizon      *horizonDoc          `json:"horizon"`
	FieldDeg     float64              `json:"field_radius_deg"`
	Exposing     *bool                `json:"exposing"`
	Target       string               `json:"target"`
	AimSince     *time.Time           `json:"aim_since"`
	EastM        float64              `json:"east_m"`
	NorthM       float64              `json:"north_m"`
	UpM          float64              `json:"up_m"`
}

func (c *call) neighbours() error {
	v, _ := c.view()
	at := v.knownAt()
	out := neighboursDoc{At: at.UTC(), Neighbours: []neighbourDoc{}}
	for i := range v.Rules.Neighbours {
		n := &v.Rules.Neighbours[i]
		d := neighbourDoc{
			ID: n.ID, State: "silent", StaleAfterS: n.StaleAfter.Seconds(), ForgetAfterS: n.ForgetAfter.Seconds(), WhenSilent: "shutter",
			Yields: [...]string{"ours", "theirs", "later"}[min(n.Yields, 2)], FieldDeg: n.Field.Degrees(), EastM: n.Offset.X, NorthM: n.Offset.Y, UpM: n.Offset.Z,
		}
		if n.IgnoreSilent {
			d.WhenSilent = "ignore"
		}
		if p := v.pointing(n.ID); p != nil {
			d.SaidAt, d.AgeS, d.AimSince, d.Target = wire.Instant(p.Seen.Said), ageOf(at, p.Seen.Said, p.Heard), wire.Instant(p.AimBegan), p.Seen.Target
			if d.AgeS != nil && *d.AgeS <= n.StaleAfter.Seconds() {
				d.State = "heard"
			}
			if p.Seen.Field > 0 {
				d.FieldDeg = p.Seen.Field.Degrees()
			}
			if p.Seen.Exposing != closures.NotSaid {
				exposing := p.Seen.Exposing == closures.Yes
				d.Exposing = &exposing
			}
			if p.Aim != nil {
				d.ICRS, d.Horizon, _ = pointing(p.Aim, v.Nights, at)
			}
		}
		out.Neighbours = append(out.Neighbours, d)
	}
	return c.reply(http.StatusOK, out)
}

// pointing returns where a neighbour telescope is known to point, or nil.
func (v *View) pointing(id closures.TelescopeID) *closures.Pointing {
	if v.Known != nil {
		for i := range v.Known.Pointings {
			if v.Known.Pointings[i].Telescope == id {
				return &v.Known.Pointings[i]
			}
		}
	}
	return nil
}
