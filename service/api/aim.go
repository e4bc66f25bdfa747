package api

import (
	"net/http"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry"
	"beamward/geometry/sky"
)

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
