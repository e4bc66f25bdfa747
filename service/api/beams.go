package api

import (
	"net/http"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
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

// degrees makes an angle of degrees.
func degrees(d float64) s1.Angle { return s1.Angle(d) * s1.Degree }
