package closures

import (
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/geometry/span"
)

// Fact is the core's only input: one thing that the service was told or
// noticed.
type Fact struct {
	Seq  uint64    // given by the engine, strictly rising
	At   time.Time // the engine's clock at admission: UTC, no monotonic part
	From Source
	Body Body
}

// Body is what a fact says. The set is sealed.
type Body interface{ fact() }

// RulesSet puts rules in force.
type RulesSet struct {
	Rules *Rules
	By    string
}

// ListOffered is a closure list that was read whole. By names the person or
// the folder that brought it.
type ListOffered struct {
	List *List
	By   string
}

// ListConfirmed lets a waiting list take effect.
type ListConfirmed struct {
	Authority AuthorityID
	ID        ListID
	Digest    Digest // of what the person saw
	By        string
}

// ListWithdrawn takes a list out of force, which loosens: unless the
// authority's rule lets it happen at once it waits for ConfirmedBy.
type ListWithdrawn struct {
	Authority   AuthorityID
	ID          ListID
	By          string
	ConfirmedBy string
	Reference   string
}

// NightReady brings the sky of one 12 h bin, prepared beforehand.
type NightReady struct{ Night *sky.Night }

// AimSeen is where a beam or a neighbour telescope points. One of Beam and
// Telescope is set.
type AimSeen struct {
	Beam      BeamID
	Telescope TelescopeID
	Said      time.Time
	Aim       *Aim
	From      string // "encoder", "command", or what the sender calls it
	Target    string
	Field     s1.Angle // a neighbour's field radius; zero: as configured
	Exposing  Tristate
}

// Tristate is yes, no or not said.
type Tristate uint8

// The three values.
const (
	NotSaid Tristate = iota
	Yes
	No
)

// AltitudeFrom says what an altitude is measured from.
type AltitudeFrom uint8

// The references of an aircraft's altitude.
const (
	NoAltitude AltitudeFrom = iota
	AboveEllipsoid
	AboveMeanSeaLevel
	PressureAltitude
)

// AircraftSeen is one report of one aircraft. Velocity parts and errors that
// were not given are NaN.
type AircraftSeen struct {
	Source           Source
	Said             time.Time
	Aircraft         string // the sender's address for it, such as a 24-bit address in hex
	Located          bool
	Position         earth.Position // Height is the altitude as given, in AltitudeFrom's reference
	AltitudeFrom     AltitudeFrom
	Speed            geometry.Speed // over ground
	Track            s1.Angle       // of true north
	Climb            geometry.Speed
	Error            geometry.Length // hard bound, horizontal
	VerticalError    geometry.Length
	VelocityError    geometry.Speed
	VerticalVelError geometry.Speed
	OnGround         bool
	Drill            bool // a simulated aircraft, which can only close
}

// Sighted is a spotter's word. Without a direction it is about the whole sky.
type Sighted struct {
	Source       Source
	Said         time.Time
	HasDirection bool
	Direction    r3.Vector // local: X east, Y north, Z up
	Spread       s1.Angle
	For          time.Duration
	Clear        bool
}

// DetectorState is what a detector says of its sky.
type DetectorState uint8

// The detector's states. The zero value is the safe one.
const (
	DetectorBlind DetectorState = iota
	DetectorAlarm
	DetectorClear
)

// DetectorSeen is a report of a detector of aircraft.
type DetectorSeen struct {
	Source Source
	Said   time.Time
	State  DetectorState
}

// InterlockSeen is what an interlock on site says.
type InterlockSeen struct {
	Source Source
	Said   time.Time
	Safe   bool
}

// ShutterPosition is where a beam's shutter is.
type ShutterPosition uint8

// The shutter's positions.
const (
	ShutterUnknown ShutterPosition = iota
	ShutterOpen
	ShutterMoving
	ShutterClosed
)

// ShutterSeen is a report of a beam's shutter.
type ShutterSeen struct {
	Beam     BeamID
	Said     time.Time
	Position ShutterPosition
}

// LaserSeen says whether light leaves a beam's launch. PowerW is NaN when not
// given.
type LaserSeen struct {
	Beam     BeamID
	Said     time.Time
	Emitting bool
	PowerW   float64
}

// WatchKept says who keeps the watch at a post, and until when.
type WatchKept struct {
	Post  string
	Said  time.Time
	By    []string
	Until time.Time
}

// WeatherSeen is pressure and temperature at the site.
type WeatherSeen struct {
	Source      Source
	Said        time.Time
	PressureHPa float64
	Temperature float64 // °C
}

// HeardScope says what a Heard proves.
type HeardScope uint8

// A link that lives, or reception that was shown to work.
const (
	HeardLink HeardScope = iota
	HeardReception
)

// Heard says that a source lives.
type Heard struct {
	Source            Source
	Said              time.Time
	Scope             HeardScope
	MessagesPerMinute float64 // NaN when not given
	Connected         bool    // a connection was made just now: unbroken reception starts again
}

// HoldPlaced shutters a beam, or every beam, because a person said so.
type HoldPlaced struct {
	ID        HoldID
	Beam      BeamID // EveryBeam: all of them
	Reason    string
	By        string
	Placed    time.Time
	From      time.Time // zero: at once
	Until     time.Time // zero: until released
	Region    *Region   // nil: the whole sky
	Authority bool      // an authority's order, which a second person releases with a reference
	Caller    string
	CallBack  string
}

// Span returns when the hold applies; without an end it lasts until Forever.
func (h *HoldPlaced) Span() span.Span {
	s := span.Span{From: h.From, Until: h.Until}
	if s.From.IsZero() {
		s.From = h.Placed
	}
	if s.Until.IsZero() {
		s.Until = Forever
	}
	return s
}

// Forever is the end of what has no end.
var Forever = time.Date(9999, 12, 31, 0, 0, 0, 0, time.UTC)

// HoldReleased ends a hold.
type HoldReleased struct {
	ID        HoldID
	By        string
	Reference string
}

// Rearmed is an operator's word that a beam may open again after a cause that
// asks for a person.
type Rearmed struct {
	Beam BeamID // EveryBeam: all of them
	By   string
	Note string
}

// TrackReleased drops a lost track on a spotter's word.
type TrackReleased struct {
	Aircraft string
	Source   Source
	By       string
	Spotter  string
}

// ClockState is what the shell knows of its clock.
type ClockState struct {
	Step         time.Duration // jump of the wall clock since the last state, beyond slewing
	Suspended    bool          // the machine slept since the last state
	Synchronised bool          // by the kernel's own word
	MaxError     time.Duration // the kernel's bound; negative: unknown
}

// RecordState is what the shell knows of the record.
type RecordState struct {
	Durable uint64        // all entries up to here are on disk
	Behind  time.Duration // age of the oldest entry not yet on disk
	Half    bool          // the queue is over half full
	Full    bool          // the queue refused something
	Failed  bool          // the store errs
	Damaged bool          // the chain does not verify before its last block
}

// Started says that the durable facts are restored and facts may come.
type Started struct{}

// Veto is the second opinion's word against an open beam.
type Veto struct {
	Beam   BeamID
	Detail string // fixed text only
}

// Fault is a broken rule or a panic in the service itself.
type Fault struct {
	Beam   BeamID // EveryBeam: all of them
	Detail string // fixed text only
}

// Tick says that time passed.
type Tick struct{}

func (RulesSet) fact()      {}
func (ListOffered) fact()   {}
func (ListConfirmed) fact() {}
func (ListWithdrawn) fact() {}
func (NightReady) fact()    {}
func (AimSeen) fact()       {}
func (AircraftSeen) fact()  {}
func (Sighted) fact()       {}
func (DetectorSeen) fact()  {}
func (InterlockSeen) fact() {}
func (ShutterSeen) fact()   {}
func (LaserSeen) fact()     {}
func (WatchKept) fact()     {}
func (WeatherSeen) fact()   {}
func (Heard) fact()         {}
func (HoldPlaced) fact()    {}
func (HoldReleased) fact()  {}
func (Rearmed) fact()       {}
func (TrackReleased) fact() {}
func (ClockState) fact()    {}
func (RecordState) fact()   {}
func (Started) fact()       {}
func (Veto) fact()          {}
func (Fault) fact()         {}
func (Tick) fact()          {}
