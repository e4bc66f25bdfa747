package api

import (
	"net/http"
	"strings"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/sky"
	"beamward/service/access"
)

func beamRoutes() []route {
	return []route{
		{method: "GET", path: "/v1/beams", id: "beams", summary: "Every beam: its set-up, its state and why", action: access.See, answer: beamsDoc{}, serve: (*call).beams},
		{method: "GET", path: "/v1/beams/{beam}", id: "beam", summary: "One beam", action: access.See, answer: beamDoc{}, serve: (*call).beam},
		{method: "GET", path: "/v1/beams/{beam}/aim", id: "aim", summary: "Where the beam points, for neighbours", action: access.See, answer: aimDoc{}, serve: (*call).aim},
		{method: "GET", path: "/v1/beams/{beam}/exposure", id: "exposure", summary: "Exposure limits and hazard distances, with their cautions", action: access.See,
			query:  []param{{"elevation_deg", "one elevation; else the lowest allowed, 45, 60 and 90", numberOf(0.1, 90)}},
			answer: exposureDoc{}, errors: []int{409}, serve: (*call).exposure},
		{method: "GET", path: "/v1/beams/{beam}/permit", id: "permit", summary: "A short signed lease: open or shuttered", action: access.See,
			query:  []param{{"nonce", "echoed inside the signed bytes: at most 64 of A-Z a-z 0-9 _ -", textOf(maxNonce)}},
			answer: wire.Permit{}, serve: (*call).permit},
		{method: "GET", path: "/v1/permit-key", id: "permitKey", summary: "The key that permits are signed by (JWK, RFC 8037)", action: access.See,
			gives: []string{"application/jwk+json", jsonType}, answer: jwkDoc{}, serve: (*call).permitKey},
		{method: "POST", path: "/v1/beams/{beam}/rearm", id: "rearm", summary: "Let a beam open again after a cause that asks for a person; * is every beam", action: access.Act, budget: forWriting,
			headers: []param{ifMatchParam}, takes: []string{jsonType}, body: rearmBody{}, optional: true, answer: rearmDoc{}, errors: []int{409, 412}, serve: (*call).rearm},
	}
}

var ifMatchParam = param{"If-Match", "the ETag of what was looked at; 412 if it changed", textOf(256)}

// jwkDoc is a public key of Ed25519.
type jwkDoc struct {
	Kty string `json:"kty"`
	Crv string `json:"crv"`
	X   string `json:"x"`
	Kid string `json:"kid,omitempty"`
	Alg string `json:"alg,omitempty"`
	Use string `json:"use,omitempty"`
}

type beamsDoc struct {
	At        time.Time `json:"at"`
	BootID    string    `json:"boot_id"`
	Simulated bool      `json:"simulated"`
	Beams     []beamDoc `json:"beams"`
}

// beamDoc is a beam's set-up and its state.
type beamDoc struct {
	ID             closures.BeamID `json:"id"`
	WavelengthNM   float64         `json:"wavelength_nm"`
	PowerW         float64         `json:"power_w"`
	ApertureM      float64         `json:"aperture_m"`
	FocusHeightM   float64         `json:"focus_height_m"`
	GuideStar      string          `json:"guide_star" doc:"sodium or rayleigh"`
	AsterismArcsec float64         `json:"asterism_radius_arcsec"`
	Launches       []launchDoc     `json:"launches"`
	ElevationMin   float64         `json:"elevation_min_deg"`
	ElevationMax   float64         `json:"elevation_max_deg"`
	SunBelow       float64         `json:"sun_below_deg"`
	ShutterTimeMS  int64           `json:"shutter_time_ms"`
	ReopenAfterMS  int64           `json:"reopen_after_ms"`
	LeaseMS        int64           `json:"lease_ms"`
	Now            beamState       `json:"now"`
}

type launchDoc struct {
	ID     string  `json:"id"`
	EastM  float64 `json:"east_m"`
	NorthM float64 `json:"north_m"`
	UpM    float64 `json:"up_m"`
}

func beamOf(v *View, r *closures.BeamRules, fresh bool) beamDoc {
	out := beamDoc{
		ID: r.ID, WavelengthNM: float64(r.Wavelength) * 1e9, PowerW: r.PowerW, ApertureM: float64(r.Aperture), FocusHeightM: float64(r.FocusHeight),
		GuideStar: "sodium", AsterismArcsec: float64(r.Asterism / geometry.Arcsecond), Launches: []launchDoc{},
		ElevationMin: r.Limits.ElevationMin.Degrees(), ElevationMax: r.Limits.ElevationMax.Degrees(), SunBelow: r.Limits.SunBelow.Degrees(),
		ShutterTimeMS: r.ShutterTime.Milliseconds(), ReopenAfterMS: r.ReopenAfter.Milliseconds(), LeaseMS: v.Rules.Permit.Lease.Milliseconds(),
	}
	if r.GuideStar.Rayleigh {
		out.GuideStar = "rayleigh"
	}
	for _, l := range r.Launches {
		out.Launches = append(out.Launches, launchDoc{l.ID, l.Offset.X, l.Offset.Y, l.Offset.Z})
	}
	if b := v.Beam(r.ID); b != nil {
		out.Now = stateOf(v, b, fresh)
	}
	return out
}

func (c *call) beams() error {
	v, fresh := c.view()
	out := beamsDoc{At: v.At.UTC(), BootID: v.BootID, Simulated: v.Simulated, Beams: []beamDoc{}}
	for i := range v.Rules.Beams {
		out.Beams = append(out.Beams, beamOf(v, &v.Rules.Beams[i], fresh))
	}
	return c.reply(http.StatusOK, out)
}

// theBeam returns the beam that the path names.
func (c *call) theBeam(v *View) (*closures.BeamRules, *BeamView, error) {
	id := closures.BeamID(c.name("beam"))
	r, b := v.Rules.Beam(id), v.Beam(id)
	if r == nil || b == nil {
		return nil, nil, refuse(http.StatusNotFound, "no beam of this name is configured", "see /v1/beams for those that are")
	}
	return r, b, nil
}

func (c *call) beam() error {
	v, fresh := c.view()
	r, b, err := c.theBeam(v)
	if err != nil {
		return err
	}
	c.w.Header().Set("ETag", beamTag(v, b))
	return c.reply(http.StatusOK, beamOf(v, r, fresh))
}

// aimDoc is where a beam points. Angles are airless.
type aimDoc struct {
	Beam         closures.BeamID `json:"beam"`
	Known        bool            `json:"known" doc:"false: no usable aim is known, and the beam is shuttered"`
	State        wire.State      `json:"state"`
	At           time.Time       `json:"at" doc:"for which the directions are given"`
	SaidAt       *time.Time      `json:"said_at"`
	AgeS         *float64        `json:"age_s"`
	StaleAfterS  float64         `json:"stale_after_s"`
	Frame        string          `json:"frame" doc:"icrs, of_date, horizon or table: how the aim was stated"`
	ICRS         *equatorDoc     `json:"icrs"`
	Horizon      *horizonDoc     `json:"horizon"`
	ErrorArcsec  *float64        `json:"error_arcsec" doc:"hard bound"`
	Motion       string          `json:"motion"`
	Target       string          `json:"target"`
	From         string          `json:"from"`
	WavelengthNM float64         `json:"wavelength_nm"`
}

type equatorDoc struct {
	RA  float64 `json:"ra_deg"`
	Dec float64 `json:"dec_deg"`
}

type horizonDoc struct {
	Az float64 `json:"az_deg"`
	El float64 `json:"el_deg"`
}

func (c *call) aim() error {
	v, fresh := c.view()
	r, b, err := c.theBeam(v)
	if err != nil {
		return err
	}
	k, now := v.known(r.ID), c.wall()
	out := aimDoc{Beam: r.ID, At: now.UTC(), StaleAfterS: r.Aim.StaleAfter.Seconds(), Motion: motionWord(nil), WavelengthNM: float64(r.Wavelength) * 1e9}
	if v.shown(b, fresh).Decision.Open {
		out.State = wire.Open
	}
	if !k.AimHeard.IsZero() {
		out.SaidAt, out.AgeS = wire.Instant(k.Aim.Said), ageOf(now, k.Aim.Said, k.AimHeard)
		out.Target, out.From, out.Motion = k.Aim.Target, k.Aim.From, motionWord(k.Aim.Aim)
	}
	if k.AimUsed != nil {
		out.Frame = frameWord(k.AimUsed.Frame)
		out.ICRS, out.Horizon, out.ErrorArcsec = pointing(k.AimUsed, v.Nights, now)
		if out.ErrorArcsec != nil {
			out.ErrorArcsec = finite(*out.ErrorArcsec + float64(r.Aim.Error/geometry.Arcsecond))
		}
		out.Known = out.Horizon != nil
	}
	return c.reply(http.StatusOK, out)
}

// pointing gives an aim's airless directions at an instant; nil where the
// night is not prepared or the aim does not reach.
func pointing(a *closures.Aim, nights []*sky.Night, at time.Time) (eq *equatorDoc, hor *horizonDoc, errArcsec *float64) {
	for _, n := range nights {
		if n == nil || !closures.BinOf(n).Contains(at) {
			continue
		}
		if dir, e, ok := a.At(n, at); ok {
			az, el := geometry.ToHorizon(dir)
			hor, errArcsec = &horizonDoc{az.Degrees(), el.Degrees()}, finite(float64(e/geometry.Arcsecond))
		}
		if dir, _, ok := a.InSky(n, at); ok {
			ra, dec := geometry.ToEquator(dir)
			eq = &equatorDoc{ra.Degrees(), dec.Degrees()}
		}
	}
	return eq, hor, errArcsec
}

func frameWord(f closures.AimFrame) string {
	switch f {
	case closures.ICRS:
		return "icrs"
	case closures.OfDate:
		return "of_date"
	case closures.Horizon:
		return "horizon"
	case closures.Table:
		return "table"
	}
	return ""
}

func motionWord(a *closures.Aim) string {
	if a == nil {
		return "not-said"
	}
	switch a.Motion {
	case closures.Tracking:
		return "tracking"
	case closures.Slewing:
		return "slewing"
	case closures.Parked:
		return "parked"
	case closures.Fixed:
		return "fixed"
	}
	return "not-said"
}

func (c *call) permit() error {
	nonce := c.query.Get("nonce")
	if !validNonce(nonce) {
		return badQuery("nonce", "it cannot be echoed", "use at most 64 of A-Z a-z 0-9 _ -")
	}
	v := c.api.options.Engine.View()
	r, _, err := c.theBeam(v)
	if err != nil {
		return err
	}
	if c.api.options.Permits == nil {
		return refuse(http.StatusServiceUnavailable, "this service issues no permits", "")
	}
	body, err := c.api.options.Permits.Permit(r.ID, nonce)
	if err != nil {
		return err
	}
	return c.send(http.StatusOK, jsonType, body)
}

const maxNonce = 64

// validNonce reports whether a nonce is echoed: at most maxNonce characters
// that need no escape in a URL or in JSON. None at all is valid.
func validNonce(s string) bool {
	return len(s) <= maxNonce && !strings.ContainsFunc(s, func(r rune) bool {
		return !(r >= 'A' && r <= 'Z' || r >= 'a' && r <= 'z' || r >= '0' && r <= '9' || r == '_' || r == '-')
	})
}

func (c *call) permitKey() error {
	if c.api.options.Permits == nil {
		return refuse(http.StatusServiceUnavailable, "this service issues no permits", "")
	}
	return c.send(http.StatusOK, c.gives, c.api.options.Permits.Key())
}

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

// degrees makes an angle of degrees.
func degrees(d float64) s1.Angle { return s1.Angle(d) * s1.Degree }
