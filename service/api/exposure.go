package api

import (
	"math"
	"net/http"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/exposure"
)

// exposureDoc is the hazard of a beam. Distances to keep are rounded outward
// to a metre; null is none, or without bound.
type exposureDoc struct {
	Beam         closures.BeamID     `json:"beam"`
	WavelengthNM float64             `json:"wavelength_nm"`
	PowerW       float64             `json:"power_w"`
	MPE          float64             `json:"mpe_w_m2"`
	Photopic     float64             `json:"photopic_efficiency"`
	Levels       []levelDoc          `json:"levels"`
	Elevations   []exposureElevation `json:"elevations"`
	Cautions     []string            `json:"cautions" doc:"to be shown wherever any of the numbers is"`
}

type levelDoc struct {
	Name       string  `json:"name"`
	Irradiance float64 `json:"irradiance_w_m2"`
	Clause     string  `json:"clause"`
}

type exposureElevation struct {
	Elevation float64    `json:"elevation_deg"`
	FocusM    *float64   `json:"focus_m"`
	PeakW     *float64   `json:"peak_w_m2" doc:"the highest irradiance anywhere"`
	Reaches   []reachDoc `json:"reaches" doc:"one for each level, in their order"`
}

type reachDoc struct {
	Level       string   `json:"level"`
	Passings    int      `json:"passings" doc:"how often the limit is passed: 0 never, 1 from the aperture on, 2 about the focus"`
	FromM       *float64 `json:"from_m"`
	UntilM      *float64 `json:"until_m"`
	DistanceM   *float64 `json:"distance_m" doc:"the slant range to keep"`
	HorizontalM *float64 `json:"horizontal_m"`
	HeightM     *float64 `json:"height_m" doc:"of the end of the distance, above the ellipsoid"`
}

func outward(l geometry.Length) *float64 { return finite(math.Ceil(float64(l))) }

func (c *call) exposure() error {
	v, _ := c.view()
	r, _, err := c.theBeam(v)
	if err != nil {
		return err
	}
	setup := exposure.Setup{
		Power:       exposure.Power(r.PowerW),
		Profile:     geometry.Profile{Aperture: r.Aperture, Focus: geometry.Length(math.Inf(1)), Wavelength: r.Wavelength, Quality: 1}, // a perfect beam reaches farthest
		FocusHeight: r.FocusHeight, Site: v.Rules.Site.Position.Height,
		Elevations: []s1.Angle{r.Limits.ElevationMin, 45 * s1.Degree, 60 * s1.Degree, 90 * s1.Degree},
	}
	if setup.Elevations[0] <= 0 || setup.Elevations[0] >= 45*s1.Degree {
		setup.Elevations = setup.Elevations[1:]
	}
	if c.has("elevation_deg") {
		el, err := c.number("elevation_deg", 0.1, 90, 90)
		if err != nil {
			return err
		}
		setup.Elevations = []s1.Angle{degrees(el)}
	}
	report, err := exposure.Assess(setup)
	if err != nil {
		return closures.Errorf(closures.Conflict, "ask the laser safety officer", "there are no limits for this beam: %v", err)
	}
	out := exposureDoc{
		Beam: r.ID, WavelengthNM: float64(report.Wavelength) * 1e9, PowerW: float64(report.Power), MPE: float64(report.Limit.Irradiance), Photopic: report.Photopic,
		Levels: []levelDoc{}, Cautions: report.Cautions,
	}
	for _, l := range report.Levels {
		out.Levels = append(out.Levels, levelDoc{l.Name, float64(l.Irradiance), l.Clause})
	}
	for i := range report.Elevations {
		e := &report.Elevations[i]
		one := exposureElevation{Elevation: e.Elevation.Degrees(), FocusM: finite(float64(e.Focus)), PeakW: finite(float64(e.Peak)), Reaches: []reachDoc{}}
		for j, reach := range e.Reaches {
			one.Reaches = append(one.Reaches, reachDoc{
				Level: report.Levels[j].Name, Passings: reach.Passings, FromM: finite(math.Floor(float64(reach.From))), UntilM: outward(reach.Until),
				DistanceM: outward(reach.Distance), HorizontalM: outward(reach.Horizontal), HeightM: outward(reach.Height),
			})
		}
		out.Elevations = append(out.Elevations, one)
	}
	return c.reply(http.StatusOK, out)
}
