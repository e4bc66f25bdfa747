package client

import (
	"time"

	"beamward/closures/wire"
)

// BeamState is one beam as the service shows it. It is for people: what may
// open a shutter is a Lease alone.
type BeamState struct {
	Beam        string         `json:"beam"`
	State       wire.State     `json:"state"`
	Seq         uint64         `json:"seq"`
	DecidedAt   time.Time      `json:"decided_at"`
	Since       time.Time      `json:"since"`
	Opening     bool           `json:"opening"`
	Reasons     []wire.Reason  `json:"reasons"`
	Cautions    []wire.Caution `json:"cautions"`
	OpenUntil   *time.Time     `json:"open_until"`
	ClosesAt    *time.Time     `json:"closes_at"`
	OpensAt     *time.Time     `json:"opens_at"`
	Coming      []wire.Reason  `json:"coming"`
	Inputs      []wire.Input   `json:"inputs"`
	Rearm       []string       `json:"rearm"`
	Target      string         `json:"target"`
	Shutter     string         `json:"shutter"`
	Emitting    *bool          `json:"emitting"`
	RulesDigest string         `json:"rules_digest"`
	ListsDigest string         `json:"lists_digest"`
	Simulated   bool           `json:"simulated"`
}

// Beams is every beam.
type Beams struct {
	At        time.Time `json:"at"`
	BootID    string    `json:"boot_id"`
	Simulated bool      `json:"simulated"`
	Beams     []Beam    `json:"beams"`
}

// Beam is a beam's set-up and its state.
type Beam struct {
	ID             string    `json:"id"`
	WavelengthNM   float64   `json:"wavelength_nm"`
	PowerW         float64   `json:"power_w"`
	ApertureM      float64   `json:"aperture_m"`
	FocusHeightM   float64   `json:"focus_height_m"`
	GuideStar      string    `json:"guide_star"`
	AsterismArcsec float64   `json:"asterism_radius_arcsec"`
	Launches       []Launch  `json:"launches"`
	ElevationMin   float64   `json:"elevation_min_deg"`
	ElevationMax   float64   `json:"elevation_max_deg"`
	SunBelow       float64   `json:"sun_below_deg"`
	ShutterTimeMS  int64     `json:"shutter_time_ms"`
	ReopenAfterMS  int64     `json:"reopen_after_ms"`
	LeaseMS        int64     `json:"lease_ms"`
	Now            BeamState `json:"now"`

	ETag string `json:"-"` // of Beam alone
}

// Launch is where light leaves, from the site's reference point.
type Launch struct {
	ID     string  `json:"id"`
	EastM  float64 `json:"east_m"`
	NorthM float64 `json:"north_m"`
	UpM    float64 `json:"up_m"`
}

// Span is a span of time, half open.
type Span struct {
	From  time.Time `json:"from"`
	Until time.Time `json:"until"`
}

// Equator is an ICRS direction.
type Equator struct {
	RA  float64 `json:"ra_deg"`
	Dec float64 `json:"dec_deg"`
}

// Horizon is a local direction: azimuth from north through east.
type Horizon struct {
	Az float64 `json:"az_deg"`
	El float64 `json:"el_deg"`
}

// Aim is where a beam points. Angles are airless.
type Aim struct {
	Beam         string     `json:"beam"`
	Known        bool       `json:"known"`
	State        wire.State `json:"state"`
	At           time.Time  `json:"at"`
	SaidAt       *time.Time `json:"said_at"`
	AgeS         *float64   `json:"age_s"`
	StaleAfterS  float64    `json:"stale_after_s"`
	Frame        string     `json:"frame"`
	ICRS         *Equator   `json:"icrs"`
	Horizon      *Horizon   `json:"horizon"`
	ErrorArcsec  *float64   `json:"error_arcsec"`
	Motion       string     `json:"motion"`
	Target       string     `json:"target"`
	From         string     `json:"from"`
	WavelengthNM float64    `json:"wavelength_nm"`
}

// Source is what is known of one source of facts.
type Source struct {
	ID          string     `json:"id"`
	Kind        string     `json:"kind"`
	Required    bool       `json:"required"`
	State       string     `json:"state"`
	SaidAt      *time.Time `json:"said_at"`
	HeardAt     *time.Time `json:"heard_at"`
	Since       *time.Time `json:"since"`
	AgeS        *float64   `json:"age_s"`
	StaleAfterS float64    `json:"stale_after_s"`
	PerMinute   *float64   `json:"messages_per_min"`
	Safe        *bool      `json:"safe"`
}

// Sources is every source.
type Sources struct {
	At      time.Time `json:"at"`
	Sources []Source  `json:"sources"`
}

// View is everything that a display shows at once, as the stream sends it.
type View struct {
	At        time.Time   `json:"at"`
	BootID    string      `json:"boot_id"`
	Seq       uint64      `json:"seq"`
	Fresh     bool        `json:"fresh"`
	Simulated bool        `json:"simulated"`
	Site      string      `json:"site"`
	Beams     []BeamState `json:"beams"`
	Holds     []Hold      `json:"holds"` // at most 100
	HoldTotal int         `json:"hold_total"`
	Lists     []ListHead  `json:"lists"`
	ListTotal int         `json:"list_total"`
	Sources   []Source    `json:"sources"`
	Record    Record      `json:"record"`
	Aircraft  int         `json:"aircraft"`
}

// Record is how the record stands.
type Record struct {
	Healthy bool    `json:"healthy"`
	Durable uint64  `json:"durable"`
	BehindS float64 `json:"behind_s"`
}
