package main

import (
	"fmt"
	"math"
	"strings"
	"time"

	"github.com/golang/geo/s1"
	"github.com/spf13/cobra"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/exposure"
)

func exposureCommand(out *console) *cobra.Command {
	var from configFlag
	var beam, edition, elevations string
	var pulse, exposed time.Duration
	var repetition float64
	c := &cobra.Command{
		Use:   "exposure --config FILE [--beam BEAM]",
		Short: "Compute exposure limits and hazard distances of a beam, for planning",
		Long: `Computes the maximum permissible exposure of the eye, the nominal ocular hazard
distance and the distances beyond which the beam is too dim to disturb a pilot's
sight, with all the power in one launch of the beam.

The numbers are aids to a competent person. They are no hazard evaluation.`,
		Args: cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			cfg, err := from.load()
			if err != nil {
				return err
			}
			b, err := beamOf(cfg.Rules, beam)
			if err != nil {
				return err
			}
			s := setupOf(cfg.Rules, b)
			if s.Edition, err = editionOf(edition); err != nil {
				return err
			}
			if s.Elevations, err = elevationsOf(elevations, b); err != nil {
				return err
			}
			s.Pulse, s.Repetition, s.Exposure = pulse, repetition, exposed
			r, err := exposure.Assess(s)
			if err != nil {
				return fmt.Errorf("assessing beam %s: %w", b.ID, err)
			}
			if out.json {
				return out.document(exposureJSON(b.ID, s.Edition, &r))
			}
			return writeExposure(out, b.ID, s.Edition, &r)
		},
	}
	from.on(c)
	c.Flags().StringVar(&beam, "beam", "", "the beam, where there are several")
	c.Flags().StringVar(&elevations, "elevations", "", "elevations in degrees, such as 30,60,90; left out: the beam's lowest, 45 and 90")
	choice(c, &edition, "edition", "strictest", "whose limits for short pulses", "strictest", "2006", "2014")
	c.Flags().DurationVar(&pulse, "pulse", 0, "length of a pulse, such as 200ns; 0: continuous")
	c.Flags().Float64Var(&repetition, "repetition-hz", 0, "pulses a second")
	c.Flags().DurationVar(&exposed, "exposure", 0, "how long an eye is in the beam; 0: until it turns away, 250ms")
	return c
}

// setupOf describes a beam as if all its power left by one launch, which no
// share of it exceeds.
func setupOf(r *closures.Rules, b *closures.BeamRules) exposure.Setup {
	lowest := math.Inf(1)
	for _, l := range b.Launches {
		lowest = math.Min(lowest, l.Offset.Z)
	}
	return exposure.Setup{
		Power:       exposure.Power(b.PowerW),
		Profile:     geometry.Profile{Aperture: b.Aperture, Wavelength: b.Wavelength, Quality: 1},
		FocusHeight: b.FocusHeight,
		Site:        r.Site.Position.Height + geometry.Length(lowest),
	}
}

func editionOf(word string) (exposure.Edition, error) {
	switch word {
	case "strictest":
		return exposure.Strictest, nil
	case "2006":
		return exposure.Directive2006, nil
	case "2014":
		return exposure.Editions2014, nil
	}
	return 0, oneOf("edition", word, "strictest", "2006", "2014")
}

func elevationsOf(text string, b *closures.BeamRules) ([]s1.Angle, error) {
	if text == "" {
		lowest := b.Limits.ElevationMin
		if !(lowest > 0) {
			lowest = 10 * s1.Degree
		}
		return []s1.Angle{lowest, 45 * s1.Degree, 90 * s1.Degree}, nil
	}
	var out []s1.Angle
	for _, cell := range strings.Split(text, ",") {
		v, err := wire.ParseNumber(strings.TrimSpace(cell))
		if err != nil || !(v > 0 && v <= 90) {
			return nil, usagef("--elevations %.40q: write degrees over 0 and at most 90, such as 30,60,90", cell)
		}
		out = append(out, s1.Angle(v)*s1.Degree)
	}
	return out, nil
}

// up and down round a distance to a whole metre on the safe side; a millionth
// of one is what arithmetic leaves of nothing.
func up(m geometry.Length) float64   { return math.Max(math.Ceil(float64(m)-1e-6), 0) }
func down(m geometry.Length) float64 { return math.Floor(float64(m)) }

type (
	exposureDoc struct {
		Beam             closures.BeamID       `json:"beam"`
		WavelengthNM     float64               `json:"wavelength_nm"`
		PowerW           float64               `json:"power_w"`
		Edition          string                `json:"edition"`
		Rule             string                `json:"rule"`
		ExposureS        float64               `json:"exposure_s"`
		MPEWM2           float64               `json:"mpe_w_m2"`
		MPEPulseJM2      float64               `json:"mpe_pulse_j_m2,omitempty"`
		PhotopicFraction float64               `json:"photopic_efficiency"`
		Levels           []exposureLevel       `json:"levels"`
		Elevations       []exposureAtElevation `json:"elevations"`
		Cautions         []string              `json:"cautions"`
	}
	exposureLevel struct {
		Name         string  `json:"name"`
		IrradianceWM float64 `json:"irradiance_w_m2"`
		Clause       string  `json:"clause"`
	}
	exposureAtElevation struct {
		ElevationDeg float64         `json:"elevation_deg"`
		PeakWM2      float64         `json:"peak_w_m2"`
		Reaches      []exposureReach `json:"reaches"`
	}
	exposureReach struct {
		Level       string  `json:"level"`
		FromM       float64 `json:"from_m"`
		UntilM      float64 `json:"until_m"`
		FarFieldM   float64 `json:"far_field_m"`
		DistanceM   float64 `json:"distance_m"`
		HorizontalM float64 `json:"horizontal_m"`
		HeightM     float64 `json:"height_m"`
	}
)

func exposureJSON(beam closures.BeamID, edition exposure.Edition, r *exposure.Report) exposureDoc {
	d := exposureDoc{
		Beam: beam, WavelengthNM: float64(r.Wavelength) * 1e9, PowerW: float64(r.Power), Edition: edition.String(),
		Rule: r.Limit.Rule.String(), ExposureS: r.Limit.Exposure.Seconds(), MPEWM2: float64(r.Limit.Irradiance),
		MPEPulseJM2: float64(r.Limit.PerPulse), PhotopicFraction: r.Photopic, Cautions: r.Cautions,
	}
	for _, l := range r.Levels {
		d.Levels = append(d.Levels, exposureLevel{l.Name, float64(l.Irradiance), l.Clause})
	}
	for _, a := range r.Elevations {
		one := exposureAtElevation{ElevationDeg: a.Elevation.Degrees(), PeakWM2: float64(a.Peak)}
		for i, reach := range a.Reaches {
			one.Reaches = append(one.Reaches, exposureReach{
				Level: r.Levels[i].Name, FromM: down(reach.From), UntilM: up(reach.Until), FarFieldM: up(reach.FarField),
				DistanceM: up(reach.Distance), HorizontalM: up(reach.Horizontal), HeightM: up(reach.Height),
			})
		}
		d.Elevations = append(d.Elevations, one)
	}
	return d
}

func writeExposure(out *console, beam closures.BeamID, edition exposure.Edition, r *exposure.Report) error {
	out.printf("beam %s: %.6g W at %.6g nm, all in one launch\n", beam, float64(r.Power), float64(r.Wavelength)*1e9)
	if r.Limit.PerPulse > 0 {
		out.printf("exposure limit of the eye: %.4g J/m² a pulse, %.4g W/m² on average, for %v (%s; %s)\n",
			float64(r.Limit.PerPulse), float64(r.Limit.Irradiance), r.Limit.Exposure, r.Limit.Rule, edition)
	} else {
		out.printf("exposure limit of the eye: %.4g W/m² for %v (%s)\n", float64(r.Limit.Irradiance), r.Limit.Exposure, r.Limit.Rule)
	}
	rows := [][]string{{"ELEVATION_DEG", "LEVEL", "W_M2", "FROM_M", "UNTIL_M", "FAR_FIELD_M", "DISTANCE_M", "HORIZONTAL_M", "HEIGHT_M"}}
	for _, a := range r.Elevations {
		for i, reach := range a.Reaches {
			rows = append(rows, []string{
				fmt.Sprintf("%.6g", a.Elevation.Degrees()), r.Levels[i].Name, fmt.Sprintf("%.4g", float64(r.Levels[i].Irradiance)),
				metres(down(reach.From)), metres(up(reach.Until)), metres(up(reach.FarField)), metres(up(reach.Distance)), metres(up(reach.Horizontal)), metres(up(reach.Height)),
			})
		}
	}
	out.printf("\n")
	if err := out.table(rows); err != nil {
		return err
	}
	out.printf("\nFROM and UNTIL: where on its way the beam is at or above the level. DISTANCE: the slant range to keep.\n")
	for _, l := range r.Levels {
		out.printf("%s: %s\n", l.Name, l.Clause)
	}
	out.printf("\n")
	for _, c := range r.Cautions {
		out.printf("Caution: %s\n", c)
	}
	return nil
}

func metres(m float64) string { return fmt.Sprintf("%.0f", m) }
