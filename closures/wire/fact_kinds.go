package wire

// kind is what a fact tells of.
type kind uint8

const (
	noKind kind = iota
	kAim
	kAircraft
	kSighting
	kDetector
	kInterlock
	kShutter
	kLaser
	kWatch
	kWeather
	kHeard
	numKinds
)

// The words that a field may have, in the order of the constants they stand
// for; an empty word stands for one that cannot be said.
var words = [endWords - numTexts][]string{
	fKind - numTexts:         {"", "aim", "aircraft", "sighting", "detector", "interlock", "shutter", "laser", "watch", "weather", "heard"},
	fAltitudeFrom - numTexts: {"", "ellipsoid", "mean_sea_level", "pressure"},
	fMotion - numTexts:       {"", "tracking", "slewing", "parked", "fixed"},
	fState - numTexts:        {"blind", "alarm", "clear"},
	fPosition - numTexts:     {"", "open", "moving", "closed"},
	fScope - numTexts:        {"link", "reception"},
}

// fields is a set of fields.
type fields uint64

const _ = uint(64 - numFields) // they fit

func setOf(f ...field) (s fields) {
	for _, one := range f {
		s |= 1 << one
	}
	return s
}

func (s fields) has(f field) bool { return s&(1<<f) != 0 }

// first returns the first field of a set that is not empty.
func (s fields) first() field {
	for f := field(0); f < numFields; f++ {
		if s.has(f) {
			return f
		}
	}
	return noField
}

// must and may are the fields of each kind: those without which it is refused,
// and all.
var must = [numKinds]fields{
	kAim:       setOf(fKind, fAt),
	kAircraft:  setOf(fKind, fAt, fSource, fAircraft),
	kSighting:  setOf(fKind, fAt, fSource),
	kDetector:  setOf(fKind, fAt, fSource, fState),
	kInterlock: setOf(fKind, fAt, fSource, fSafe),
	kShutter:   setOf(fKind, fAt, fBeam, fPosition),
	kLaser:     setOf(fKind, fAt, fBeam, fEmitting),
	kWatch:     setOf(fKind, fAt, fPost, fBy, fUntil),
	kWeather:   setOf(fKind, fAt, fSource, fPressure, fTemperature),
	kHeard:     setOf(fKind, fAt, fSource, fScope),
}

var may = [numKinds]fields{
	kAim: must[kAim] | setOf(fBeam, fTelescope, fICRS, fOfDate, fHorizon, fTable, fRate, fPM, fErrorArcsec, fFrom, fTarget, fMotion,
		fRefracted, fFieldRadius, fExposing),
	kAircraft: must[kAircraft] | setOf(fLat, fLon, fAltitude, fAltitudeFrom, fSpeed, fTrack, fClimb, fError, fVerticalError,
		fVelocityError, fVerticalVelocityError, fOnGround, fDrill),
	kSighting:  must[kSighting] | setOf(fAz, fEl, fSpread, fFor, fClear),
	kDetector:  must[kDetector],
	kInterlock: must[kInterlock],
	kShutter:   must[kShutter],
	kLaser:     must[kLaser] | setOf(fPower),
	kWatch:     must[kWatch],
	kWeather:   must[kWeather],
	kHeard:     must[kHeard] | setOf(fMessages),
}
