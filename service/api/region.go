package api

import (
	"strconv"
	"time"

	"beamward/closures"
	"beamward/geometry"
)

// regionBody is a piece of sky, in the shape that closure lists have. Exactly
// one of its members is given.
type regionBody struct {
	ICRS     *coneBody  `json:"icrs,omitempty"`
	Horizon  *boxBody   `json:"horizon,omitempty"`
	Track    *trackBody `json:"track,omitempty"`
	WholeSky bool       `json:"whole_sky,omitempty"`
}

type coneBody struct {
	RA     float64 `json:"ra_deg" minimum:"0" maximum:"360"`
	Dec    float64 `json:"dec_deg" minimum:"-90" maximum:"90"`
	Radius float64 `json:"radius_deg" exclusiveMinimum:"0" maximum:"90"`
}

type boxBody struct {
	AzFrom   float64 `json:"az_from_deg" minimum:"0" maximum:"360"`
	AzTo     float64 `json:"az_to_deg" minimum:"0" maximum:"360" doc:"below az_from_deg: through north"`
	ElFrom   float64 `json:"el_from_deg" minimum:"-90" maximum:"90"`
	ElTo     float64 `json:"el_to_deg" minimum:"-90" maximum:"90"`
	Observed bool    `json:"observed,omitempty" doc:"as seen through the air"`
}

type trackBody struct {
	Radius float64     `json:"radius_deg" exclusiveMinimum:"0" maximum:"90"`
	Points []pointBody `json:"points" minItems:"2" maxItems:"1000"`
}

type pointBody struct {
	At  time.Time `json:"at"`
	RA  float64   `json:"ra_deg" minimum:"0" maximum:"360"`
	Dec float64   `json:"dec_deg" minimum:"-90" maximum:"90"`
}

const maxPoints = 1000

// region makes the core's region of what was sent; nil for the whole sky. The
// core holds the shape against its own rules once more.
func (b *regionBody) region(at string) (*closures.Region, error) {
	given := 0
	for _, yes := range []bool{b.ICRS != nil, b.Horizon != nil, b.Track != nil, b.WholeSky} {
		if yes {
			given++
		}
	}
	if given != 1 {
		return nil, wrong(at, "it has not exactly one shape", "give one of icrs, horizon, track, and whole_sky: true")
	}
	switch r := (&closures.Region{ID: "hold"}); {
	case b.ICRS != nil:
		if !within(b.ICRS.RA, 0, 360) || !within(b.ICRS.Dec, -90, 90) || !radius(b.ICRS.Radius) {
			return nil, wrong(at+"/icrs", "it is outside its bounds", "give ra_deg from 0 to 360, dec_deg from -90 to 90, radius_deg above 0 and at most 90")
		}
		r.Shape, r.Direction, r.Radius = closures.ICRSCone, geometry.FromEquator(degrees(b.ICRS.RA), degrees(b.ICRS.Dec)), degrees(b.ICRS.Radius)
		return r, nil
	case b.Horizon != nil:
		r.Shape, r.Observed = closures.HorizonBox, b.Horizon.Observed
		r.Box = geometry.Box{AzFrom: degrees(b.Horizon.AzFrom), AzTo: degrees(b.Horizon.AzTo), ElFrom: degrees(b.Horizon.ElFrom), ElTo: degrees(b.Horizon.ElTo)}
		if !r.Box.Valid() {
			return nil, wrong(at+"/horizon", "it is no box", "give azimuths from 0 to 360 that differ, and el_from_deg below el_to_deg, from -90 to 90")
		}
		return r, nil
	case b.Track != nil:
		return r, b.Track.into(r, at+"/track")
	}
	return nil, nil
}

func (b *trackBody) into(r *closures.Region, at string) error {
	if !radius(b.Radius) || len(b.Points) < 2 || len(b.Points) > maxPoints {
		return wrong(at, "it is no track", "give radius_deg above 0 and at most 90, and 2 to "+strconv.Itoa(maxPoints)+" points")
	}
	r.Shape, r.Radius = closures.TrackCone, degrees(b.Radius)
	for i, p := range b.Points {
		if !within(p.RA, 0, 360) || !within(p.Dec, -90, 90) {
			return wrong(at+"/points/"+strconv.Itoa(i), "it is outside its bounds", "give ra_deg from 0 to 360 and dec_deg from -90 to 90")
		}
		r.Points = append(r.Points, closures.AimPoint{At: p.At, Direction: geometry.FromEquator(degrees(p.RA), degrees(p.Dec))})
	}
	return nil
}

func within(v, lo, hi float64) bool { return v >= lo && v <= hi }

func radius(v float64) bool { return v > 0 && v <= 90 }

// regionOf is the document of a region; nil for the whole sky.
func regionOf(r *closures.Region) *regionBody {
	if r == nil {
		return nil
	}
	switch r.Shape {
	case closures.ICRSCone:
		ra, dec := geometry.ToEquator(r.Direction)
		return &regionBody{ICRS: &coneBody{ra.Degrees(), dec.Degrees(), r.Radius.Degrees()}}
	case closures.HorizonBox:
		b := r.Box
		return &regionBody{Horizon: &boxBody{b.AzFrom.Degrees(), b.AzTo.Degrees(), b.ElFrom.Degrees(), b.ElTo.Degrees(), r.Observed}}
	case closures.TrackCone:
		t := &trackBody{Radius: r.Radius.Degrees()}
		for _, p := range r.Points {
			ra, dec := geometry.ToEquator(p.Direction)
			t.Points = append(t.Points, pointBody{p.At.UTC(), ra.Degrees(), dec.Degrees()})
		}
		return &regionBody{Track: t}
	}
	return &regionBody{WholeSky: true}
}
