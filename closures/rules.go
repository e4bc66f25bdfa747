package closures

import (
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
)

// Rules is the whole of what a site has decided: immutable once in force.
// Validate says whether it can be met; nothing is repaired.
type Rules struct {
	Site        SiteRules
	Permit      PermitRules
	Clock       ClockRules
	ByItself    Codes // causes after which a beam opens again by itself; all others ask for a person
	Beams       []BeamRules
	Authorities []AuthorityRules
	Sources     []SourceRules
	Neighbours  []NeighbourRules
	Aircraft    AircraftRules
	Watches     []WatchRules
	Digest      Digest // of the canonical text the rules were read from
}

// SiteRules places the site and the Earth's rotation.
type SiteRules struct {
	Name     string
	TimeZone string
	Position earth.Position
	Geoid    geometry.Length // height of the geoid above the ellipsoid at the site
	UT1      sky.UT1
	Air      sky.Atmosphere // pressure and temperature, where the site states them
}

// PermitRules bounds how long a permit can be believed.
type PermitRules struct {
	Lease              time.Duration
	Renew              time.Duration // how often a reader asks
	DecisionInterval   time.Duration
	ConsumerClockError time.Duration
}

// Synchronisation says how the clock is known to be right.
type Synchronisation uint8

// Required asks the kernel; Assumed trusts means that the kernel does not
// show, and bounds the error by the step limit.
const (
	SyncRequired Synchronisation = iota
	SyncAssumed
)

// ClockRules bounds what the clock may do.
type ClockRules struct {
	Synchronised Synchronisation
	StepLimit    time.Duration
}

// MaxClockError is the largest bound of the kernel's clock error with which a
// beam may be open.
const MaxClockError = 200 * time.Millisecond

// Launch is where light leaves: metres east, north and up of the site.
type Launch struct {
	ID     string
	Offset r3.Vector
}

// GuideStar is where the light that is wanted comes back from. For sodium the
// heights are zero.
type GuideStar struct {
	Rayleigh    bool
	From, Until geometry.Length // heights above the ellipsoid, of a Rayleigh star
}

// Limits are a beam's standing limits. Elevations are as seen through the air.
type Limits struct {
	ElevationMin, ElevationMax s1.Angle
	SunBelow                   s1.Angle // the Sun's centre, airless; 90° is no limit
}

// AimRules says how a beam's aim is believed.
type AimRules struct {
	StaleAfter      time.Duration
	Error           s1.Angle // added to what an aim states
	UnannouncedMove s1.Angle // a larger move needs a shutter confirmed shut
}

// BeamRules describes one beam.
type BeamRules struct {
	ID               BeamID
	Launches         []Launch
	AimOfTelescope   bool // the aim facts state the telescope's pointing rather than the beam's
	GuideStar        GuideStar
	Wavelength       geometry.Length // in vacuum
	PowerW           float64
	Aperture         geometry.Length
	FocusHeight      geometry.Length
	Asterism         s1.Angle // radius about the aim
	Limits           Limits
	Aim              AimRules
	ShutterTime      time.Duration
	FeedbackRequired bool // a silent shutter closes
	FeedbackStale    time.Duration
	ReopenAfter      time.Duration
}

// MarginTime is the time between a withdrawal that is foreseen and the beam
// being off: the shutter's and the error of the reader's clock.
func (r *Rules) MarginTime(b *BeamRules) time.Duration {
	return b.ShutterTime + r.Permit.ConsumerClockError
}

// Guard is how far ahead a live check with reach must look: the lease and the
// margin time.
func (r *Rules) Guard(b *BeamRules) time.Duration { return r.Permit.Lease + r.MarginTime(b) }

// Integrity says what an authority's lists must prove of themselves.
type Integrity uint8

// The proofs of integrity. The zero value asks the most.
const (
	IntegrityDigest Integrity = iota
	IntegrityCount
	IntegrityNone
)

// Loosening says what a list that opens time waits for.
type Loosening uint8

// The ways a loosening list takes effect. The zero value asks the most.
const (
	LooseningSecondPerson Loosening = iota
	LooseningConfirm
	LooseningAtOnce
)

// AuthorityRules describes one authority.
type AuthorityRules struct {
	ID         AuthorityID
	Required   bool
	Integrity  Integrity
	Lead, Tail time.Duration
	Loosening  Loosening
	Folder     string // where its lists are put; empty: none is watched
	Layout     string // the layout its texts are read by; empty: native
	Phone      string
	SubmitBy   string // hh:mm in the site's zone
}

// SourceKind says what a source tells of.
type SourceKind uint8

// The kinds of sources.
const (
	NoKind SourceKind = iota
	AircraftSource
	SightingSource
	DetectorSource
	InterlockSource
	WeatherSource
)

var sourceKinds = [...]string{"", "aircraft", "sighting", "detector", "interlock", "weather"}

// String returns the kind's word.
func (k SourceKind) String() string {
	if int(k) < len(sourceKinds) {
		return sourceKinds[k]
	}
	return ""
}

// ParseSourceKind reads what String writes.
func ParseSourceKind(s string) (SourceKind, bool) {
	for k, name := range sourceKinds {
		if k > 0 && name == s {
			return SourceKind(k), true
		}
	}
	return NoKind, false
}

// SourceRules describes one source of facts.
type SourceRules struct {
	ID         Source
	Kind       SourceKind
	StaleAfter time.Duration
	Required   bool

	// Of aircraft sources.
	Latency             time.Duration // bound of the age of a report when it arrives, beyond what it says
	WarmUp              time.Duration
	MinMessagesPerMin   float64 // 0: reception is not proven by traffic
	ReferenceAddress    string  // an address that is always heard when reception works
	PositionError       geometry.Length
	VerticalError       geometry.Length
	VelocityError       geometry.Speed
	VerticalVelocityErr geometry.Speed
}

// Yields says which of two beams or fields gives way.
type Yields uint8

// Who yields. The zero value is ours, the safe one.
const (
	YieldsOurs Yields = iota
	YieldsTheirs
	YieldsLater
)

// Band is a range of wavelengths in vacuum, both ends included.
type Band struct{ From, Until geometry.Length }

// NeighbourRules describes a neighbour telescope.
type NeighbourRules struct {
	ID           TelescopeID
	Offset       r3.Vector // metres east, north, up of the site
	Aperture     geometry.Length
	Field        s1.Angle // radius
	Halo         s1.Angle // added about the field
	AimError     s1.Angle
	StaleAfter   time.Duration
	IgnoreSilent bool // when_silent: ignore; otherwise a silent neighbour shutters
	ForgetAfter  time.Duration
	Yields       Yields
	Passbands    []Band // none: every wavelength matters
	OnlyExposing bool   // a field matters only while it is exposing
}

// Unlocated says what a transponder without a position does.
type Unlocated uint8

// The answers to an aircraft that gives no position. The zero value shutters.
const (
	UnlocatedShutter Unlocated = iota
	UnlocatedAlarm
)

// AircraftRules bounds how aircraft move and what is kept free of them.
type AircraftRules struct {
	Configured       bool
	KeepOutHalfAngle s1.Angle
	KeepOutRadius    geometry.Length
	KeepOutCeiling   geometry.Length // above the ellipsoid
	HorizontalAccel  geometry.Acceleration
	VerticalAccel    geometry.Acceleration
	SpeedMax         geometry.Speed
	ClimbMax         geometry.Speed
	Unlocated        Unlocated
	LostAfter        time.Duration
	WatchRange       geometry.Length // tracks beyond are admitted once a second
	DetectionRange   geometry.Length // a track lost within stays a closure until seen or released
}

// WatchRules describes a watch post.
type WatchRules struct {
	Post     string
	Minimum  int // people
	Shift    time.Duration
	Overlap  time.Duration
	Required bool
}

// Beam returns the rules of beam id, or nil.
func (r *Rules) Beam(id BeamID) *BeamRules {
	for i := range r.Beams {
		if r.Beams[i].ID == id {
			return &r.Beams[i]
		}
	}
	return nil
}

// Authority returns the rules of authority id, or nil.
func (r *Rules) Authority(id AuthorityID) *AuthorityRules {
	for i := range r.Authorities {
		if r.Authorities[i].ID == id {
			return &r.Authorities[i]
		}
	}
	return nil
}

// Source returns the rules of source id, or nil.
func (r *Rules) Source(id Source) *SourceRules {
	for i := range r.Sources {
		if r.Sources[i].ID == id {
			return &r.Sources[i]
		}
	}
	return nil
}

// Neighbour returns the rules of neighbour id, or nil.
func (r *Rules) Neighbour(id TelescopeID) *NeighbourRules {
	for i := range r.Neighbours {
		if r.Neighbours[i].ID == id {
			return &r.Neighbours[i]
		}
	}
	return nil
}
