package wire

// field is one of the fields that a fact may have. The order puts fields of one
// type together, so that their values lie in small arrays.
type field uint8

const (
	// Names and texts.
	fSource field = iota
	fBeam
	fTelescope
	fPost
	fAircraft
	fFrom
	fTarget
	numTexts
)

const (
	// One of a few words.
	fKind = numTexts + iota
	fAltitudeFrom
	fMotion
	fState
	fPosition
	fScope
	endWords
)

const (
	// Instants.
	fAt = endWords + iota
	fUntil
	endTimes
)

const (
	// True or false.
	fRefracted = endTimes + iota
	fExposing
	fOnGround
	fDrill
	fClear
	fSafe
	fEmitting
	endBools
)

const (
	// Numbers.
	fErrorArcsec = endBools + iota
	fFieldRadius
	fLat
	fLon
	fAltitude
	fSpeed
	fTrack
	fClimb
	fError
	fVerticalError
	fVelocityError
	fVerticalVelocityError
	fAz
	fEl
	fSpread
	fFor
	fPower
	fPressure
	fTemperature
	fMessages
	// Numbers within an object; the names hold in their parents only.
	fRA
	fDec
	fRateRA
	fRateDec
	fRateAz
	fRateEl
	fPMRA
	fPMDec
	endNumbers
)

const (
	// Objects and arrays.
	fICRS = endNumbers + iota
	fOfDate
	fHorizon
	fTable
	fRate
	fPM
	fBy
	numFields
	noField = numFields
)

var fieldNames = [numFields]string{
	fSource: "source", fBeam: "beam", fTelescope: "telescope", fPost: "post", fAircraft: "aircraft", fFrom: "from", fTarget: "target",
	fKind: "kind", fAltitudeFrom: "altitude_from", fMotion: "motion", fState: "state", fPosition: "position", fScope: "scope",
	fAt: "at", fUntil: "until",
	fRefracted: "refracted", fExposing: "exposing", fOnGround: "on_ground", fDrill: "drill", fClear: "clear", fSafe: "safe", fEmitting: "emitting",
	fErrorArcsec: "error_arcsec", fFieldRadius: "field_radius_deg", fLat: "lat_deg", fLon: "lon_deg", fAltitude: "altitude_m",
	fSpeed: "speed_mps", fTrack: "track_deg", fClimb: "climb_mps", fError: "error_m", fVerticalError: "vertical_error_m",
	fVelocityError: "velocity_error_mps", fVerticalVelocityError: "vertical_velocity_error_mps", fAz: "az_deg", fEl: "el_deg",
	fSpread: "spread_deg", fFor: "for_s", fPower: "power_w", fPressure: "pressure_hpa", fTemperature: "temperature_c", fMessages: "messages_per_min",
	fRA: "ra_deg", fDec: "dec_deg", fRateRA: "ra", fRateDec: "dec", fRateAz: "az", fRateEl: "el", fPMRA: "ra", fPMDec: "dec",
	fICRS: "icrs", fOfDate: "of_date", fHorizon: "horizon", fTable: "table", fRate: "rate_arcsec_s", fPM: "pm_mas_yr", fBy: "by",
}

// fieldOf finds a field by its key at the top of a fact. The compiler makes a
// search by length and text of it, without a copy of the key.
func fieldOf(key []byte) field {
	switch string(key) {
	case "source":
		return fSource
	case "beam":
		return fBeam
	case "telescope":
		return fTelescope
	case "post":
		return fPost
	case "aircraft":
		return fAircraft
	case "from":
		return fFrom
	case "target":
		return fTarget
	case "kind":
		return fKind
	case "altitude_from":
		return fAltitudeFrom
	case "motion":
		return fMotion
	case "state":
		return fState
	case "position":
		return fPosition
	case "scope":
		return fScope
	case "at":
		return fAt
	case "until":
		return fUntil
	case "refracted":
		return fRefracted
	case "exposing":
		return fExposing
	case "on_ground":
		return fOnGround
	case "drill":
		return fDrill
	case "clear":
		return fClear
	case "safe":
		return fSafe
	case "emitting":
		return fEmitting
	case "error_arcsec":
		return fErrorArcsec
	case "field_radius_deg":
		return fFieldRadius
	case "lat_deg":
		return fLat
	case "lon_deg":
		return fLon
	case "altitude_m":
		return fAltitude
	case "speed_mps":
		return fSpeed
	case "track_deg":
		return fTrack
	case "climb_mps":
		return fClimb
	case "error_m":
		return fError
	case "vertical_error_m":
		return fVerticalError
	case "velocity_error_mps":
		return fVelocityError
	case "vertical_velocity_error_mps":
		return fVerticalVelocityError
	case "az_deg":
		return fAz
	case "el_deg":
		return fEl
	case "spread_deg":
		return fSpread
	case "for_s":
		return fFor
	case "power_w":
		return fPower
	case "pressure_hpa":
		return fPressure
	case "temperature_c":
		return fTemperature
	case "messages_per_min":
		return fMessages
	case "icrs":
		return fICRS
	case "of_date":
		return fOfDate
	case "horizon":
		return fHorizon
	case "table":
		return fTable
	case "rate_arcsec_s":
		return fRate
	case "pm_mas_yr":
		return fPM
	case "by":
		return fBy
	}
	return noField
}

// limit is the range of a number, both ends included.
type limit struct {
	low, high float64
	mend      string
}

// least is the smallest number taken where it must be above 0.
const least = 1e-9

const (
	unknownError = "give a hard bound above 0, or leave it out when it is not known"
	mendRate     = "give arcseconds a second on the sky from -36000 to 36000"
)

// The ranges are wide: they refuse slips and what cannot be, not what is rare.
// An error of exactly 0 is what programs send that know none, so it is refused.
var limits = [endNumbers - endBools]limit{
	fErrorArcsec - endBools:           {least, 36000, "give a hard bound above 0 and at most 36000, or leave it out"},
	fFieldRadius - endBools:           {least, 30, "give degrees above 0 and at most 30, or leave it out"},
	fLat - endBools:                   {-90, 90, "give degrees from -90 to 90, north positive"},
	fLon - endBools:                   {-180, 360, "give degrees from -180 to 360, east positive"},
	fAltitude - endBools:              {-1000, 100000, "give metres from -1000 to 100000"},
	fSpeed - endBools:                 {0, 3000, "give metres a second from 0 to 3000"},
	fTrack - endBools:                 {0, 360, "give degrees of true north from 0 to 360"},
	fClimb - endBools:                 {-1000, 1000, "give metres a second from -1000 to 1000"},
	fError - endBools:                 {least, 1e6, unknownError},
	fVerticalError - endBools:         {least, 1e6, unknownError},
	fVelocityError - endBools:         {least, 1e4, unknownError},
	fVerticalVelocityError - endBools: {least, 1e4, unknownError},
	fAz - endBools:                    {0, 360, "give degrees from north through east, 0 to 360"},
	fEl - endBools:                    {-90, 90, "give degrees from -90 to 90"},
	fSpread - endBools:                {least, 180, "give degrees above 0 and at most 180"},
	fFor - endBools:                   {least, 86400, "give seconds above 0 and at most 86400"},
	fPower - endBools:                 {0, 1e6, "give watts from 0 to 1000000"},
	fPressure - endBools:              {100, 1100, "give hectopascals at the site from 100 to 1100"},
	fTemperature - endBools:           {-90, 60, "give degrees Celsius from -90 to 60"},
	fMessages - endBools:              {0, 1e7, "give messages a minute from 0 to 10000000"},
	fRA - endBools:                    {0, 360, "give degrees from 0 to 360"},
	fDec - endBools:                   {-90, 90, "give degrees from -90 to 90"},
	fRateRA - endBools:                {-36000, 36000, mendRate},
	fRateDec - endBools:               {-36000, 36000, mendRate},
	fRateAz - endBools:                {-36000, 36000, mendRate},
	fRateEl - endBools:                {-36000, 36000, mendRate},
	fPMRA - endBools:                  {-1e5, 1e5, "give milliarcseconds a year on the sky from -100000 to 100000"},
	fPMDec - endBools:                 {-1e5, 1e5, "give milliarcseconds a year from -100000 to 100000"},
}
