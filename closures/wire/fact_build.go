package wire

import (
	"math"
	"math/bits"
	"time"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
)

// How far the instant that a fact names may lie from its reception.
const (
	MaxAhead  = 500 * time.Millisecond
	MaxBehind = 24 * time.Hour
)

// check holds what was read against what its kind must and may have.
func (p *Parser) check(received time.Time) *FactError {
	if !p.seen.has(fKind) {
		return refuse(fKind, "missing", "say what the fact tells of")
	}
	k := p.kind()
	if extra := p.seen &^ may[k]; extra != 0 {
		return refuse(extra.first(), "not a field of this kind: "+words[fKind-numTexts][k], "leave it out")
	}
	if missing := must[k] &^ p.seen; missing != 0 {
		return refuse(missing.first(), "missing", "the kind "+words[fKind-numTexts][k]+" needs it")
	}
	switch at := p.said(); {
	case at.Sub(received) > MaxAhead:
		return refuse(fAt, "more than "+MaxAhead.String()+" ahead of this clock", "set the sender's clock by a time server")
	case received.Sub(at) > MaxBehind:
		return refuse(fAt, "more than 24h behind this clock", "set the sender's clock by a time server, and send no old facts")
	}
	return nil
}

func (p *Parser) kind() kind      { return kind(p.words[fKind-numTexts]) }
func (p *Parser) said() time.Time { return p.times[fAt-endWords] }

// orNaN returns a number, or NaN where it was not given.
func (p *Parser) orNaN(f field) float64 {
	if p.seen.has(f) {
		return p.numbers[f-endBools]
	}
	return math.NaN()
}

// orZero returns a number, or 0 where it was not given.
func (p *Parser) orZero(f field) float64 {
	if p.seen.has(f) {
		return p.numbers[f-endBools]
	}
	return 0
}

// given returns a field's text, or nothing where it was not given.
func (p *Parser) given(f field) string {
	if p.seen.has(f) {
		return p.texts[f]
	}
	return ""
}

// chosen returns which word a field has, or 0 where it was not given.
func (p *Parser) chosen(f field) uint8 {
	if p.seen.has(f) {
		return p.words[f-numTexts]
	}
	return 0
}

func (p *Parser) build() (closures.Source, closures.Body, *FactError) {
	source, at := closures.Source(p.given(fSource)), p.said()
	beam := closures.BeamID(p.given(fBeam))
	switch p.kind() {
	case kAim:
		return p.aim()
	case kAircraft:
		return p.aircraft()
	case kSighting:
		return p.sighting()
	case kDetector:
		return source, closures.DetectorSeen{Source: source, Said: at, State: closures.DetectorState(p.chosen(fState))}, nil
	case kInterlock:
		return source, closures.InterlockSeen{Source: source, Said: at, Safe: p.yes.has(fSafe)}, nil
	case kShutter:
		return closures.Source(beam), closures.ShutterSeen{Beam: beam, Said: at, Position: closures.ShutterPosition(p.chosen(fPosition))}, nil
	case kLaser:
		return closures.Source(beam), closures.LaserSeen{Beam: beam, Said: at, Emitting: p.yes.has(fEmitting), PowerW: p.orNaN(fPower)}, nil
	case kWatch:
		post := p.given(fPost)
		return closures.Source(post), closures.WatchKept{Post: post, Said: at, By: p.people, Until: p.times[fUntil-endWords]}, nil
	case kWeather:
		return source, closures.WeatherSeen{Source: source, Said: at, PressureHPa: p.orNaN(fPressure), Temperature: p.orNaN(fTemperature)}, nil
	case kHeard:
		return source, closures.Heard{
			Source: source, Said: at, Scope: closures.HeardScope(p.chosen(fScope)), MessagesPerMinute: p.orNaN(fMessages),
		}, nil
	}
	return "", nil, refuse(fKind, "missing", "say what the fact tells of")
}

// aim builds an aim. One stated by horizon must say whether it is as seen
// through the air: near the horizon the two differ by more than a beam may err.
func (p *Parser) aim() (closures.Source, closures.Body, *FactError) {
	frames := p.seen & setOf(fICRS, fOfDate, fHorizon, fTable)
	moving := p.seen & setOf(fRate, fPM)
	switch telescope := p.seen.has(fTelescope); {
	case p.seen.has(fBeam) == telescope:
		return "", nil, refuse(fBeam, "not one of beam and telescope", "say whose aim it is: beam or telescope")
	case bits.OnesCount64(uint64(frames)) != 1:
		return "", nil, refuseLine("not one of icrs, of_date, horizon and table", "state the aim once")
	case !telescope && p.seen.has(fFieldRadius):
		return "", nil, refuse(fFieldRadius, "a beam has no field", "leave it out")
	case !telescope && p.seen.has(fExposing):
		return "", nil, refuse(fExposing, "a beam does not expose", "leave it out")
	case p.seen.has(fHorizon) != p.seen.has(fRefracted):
		return "", nil, refuse(fRefracted, "given without horizon, or horizon without it", "say with horizon, and only there, whether it is as seen through the air")
	case p.seen.has(fTable) && moving != 0:
		return "", nil, refuse(moving.first(), "a table says itself how it moves", "leave it out")
	case p.seen.has(fPM) && !p.seen.has(fICRS):
		return "", nil, refuse(fPM, "given without icrs", "give it with icrs alone")
	case p.seen.has(fRate) && p.azimuth != p.seen.has(fHorizon):
		return "", nil, refuse(fRate, "not in the frame of the aim", "give ra and dec with icrs and of_date, az and el with horizon")
	}
	aim := &closures.Aim{
		Reference: p.said(), Error: s1.Angle(p.orZero(fErrorArcsec)) * geometry.Arcsecond, Motion: closures.Motion(p.chosen(fMotion)),
		Refracted: p.yes.has(fRefracted),
	}
	switch {
	case p.seen.has(fICRS):
		aim.Frame = closures.ICRS
	case p.seen.has(fOfDate):
		aim.Frame = closures.OfDate
	case p.seen.has(fHorizon):
		aim.Frame = closures.Horizon
	default:
		aim.Frame, aim.Reference, aim.Points = closures.Table, time.Time{}, p.points
	}
	n := func(f field) s1.Angle { return degrees(p.numbers[f-endBools]) }
	switch aim.Frame {
	case closures.ICRS, closures.OfDate:
		aim.Direction = geometry.FromEquator(n(fRA), n(fDec))
	case closures.Horizon:
		aim.Direction = geometry.FromHorizon(n(fAz), n(fEl))
	}
	const arcsec = float64(geometry.Arcsecond)
	if p.seen.has(fRate) {
		first, second := fRateRA, fRateDec
		if p.azimuth {
			first, second = fRateAz, fRateEl
		}
		aim.RateRA, aim.RateDec = p.numbers[first-endBools]*arcsec, p.numbers[second-endBools]*arcsec
	}
	if p.seen.has(fPM) {
		aim.PMRA, aim.PMDec = p.numbers[fPMRA-endBools]*1e-3*arcsec, p.numbers[fPMDec-endBools]*1e-3*arcsec
	}
	if !aim.Valid() {
		return "", nil, refuse(frames.first(), "not an aim", "give a table at least two points in order of time, less than 90 degrees apart")
	}
	seen := closures.AimSeen{
		Beam: closures.BeamID(p.given(fBeam)), Telescope: closures.TelescopeID(p.given(fTelescope)), Said: p.said(), Aim: aim,
		From: p.given(fFrom), Target: p.given(fTarget), Field: degrees(p.orZero(fFieldRadius)),
	}
	if p.seen.has(fExposing) {
		seen.Exposing = closures.No
		if p.yes.has(fExposing) {
			seen.Exposing = closures.Yes
		}
	}
	if seen.Telescope != "" {
		return closures.Source(seen.Telescope), seen, nil
	}
	return closures.Source(seen.Beam), seen, nil
}

func (p *Parser) aircraft() (closures.Source, closures.Body, *FactError) {
	switch {
	case p.seen.has(fLat) != p.seen.has(fLon):
		return "", nil, refuse(fLat, "half a position", "give lat_deg and lon_deg, or neither")
	case p.seen.has(fAltitude) != p.seen.has(fAltitudeFrom):
		return "", nil, refuse(fAltitudeFrom, "altitude_m without altitude_from, or the other way round", "give both or neither")
	}
	seen := closures.AircraftSeen{
		Source: closures.Source(p.given(fSource)), Said: p.said(), Aircraft: p.given(fAircraft), Located: p.seen.has(fLat),
		AltitudeFrom: closures.AltitudeFrom(p.chosen(fAltitudeFrom)),
		Speed:        geometry.Speed(p.orNaN(fSpeed)), Track: degrees(p.orNaN(fTrack)), Climb: geometry.Speed(p.orNaN(fClimb)),
		Error: geometry.Length(p.orNaN(fError)), VerticalError: geometry.Length(p.orNaN(fVerticalError)),
		VelocityError: geometry.Speed(p.orNaN(fVelocityError)), VerticalVelError: geometry.Speed(p.orNaN(fVerticalVelocityError)),
		OnGround: p.yes.has(fOnGround), Drill: p.yes.has(fDrill),
	}
	seen.Position.Lat, seen.Position.Lon = degrees(p.orNaN(fLat)), degrees(p.orNaN(fLon))
	seen.Position.Height = geometry.Length(p.orNaN(fAltitude))
	return seen.Source, seen, nil
}

func (p *Parser) sighting() (closures.Source, closures.Body, *FactError) {
	seen := closures.Sighted{Source: closures.Source(p.given(fSource)), Said: p.said(), Clear: p.yes.has(fClear)}
	where := p.seen & setOf(fAz, fEl, fSpread)
	switch {
	case seen.Clear && p.seen&setOf(fAz, fEl, fSpread, fFor) != 0:
		return "", nil, refuse(fClear, "with where or how long", "clear takes back all that this source saw: leave az_deg, el_deg, spread_deg and for_s out")
	case where != 0 && where != setOf(fAz, fEl, fSpread):
		return "", nil, refuse(fAz, "half a direction", "give az_deg, el_deg and spread_deg, or none for the whole sky")
	}
	if where != 0 {
		n := func(f field) s1.Angle { return degrees(p.numbers[f-endBools]) }
		seen.HasDirection, seen.Direction, seen.Spread = true, geometry.FromHorizon(n(fAz), n(fEl)), n(fSpread)
	}
	seen.For = time.Duration(math.Round(p.orZero(fFor) * 1e9))
	return seen.Source, seen, nil
}
