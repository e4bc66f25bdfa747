package simulate

import (
	"strings"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry/earth"
)

// skerry is where the invented observatory stands.
var skerry = earth.Position{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: 2450}

// siteText is the configuration; @LEAD@ and @WARM@ are filled in.
const siteText = `
site:
  name: Skerry Peak
  time_zone: Atlantic/St_Helena
  lat_deg: -31.5012
  lon_deg: -4.0021
  height_m: 2450
  geoid_height_m: 18
  ut1_utc_s: 0.03
  ut1_utc_until: 2031-06-01T00:00:00Z
  pressure_hpa: 760
  temperature_c: 4

data_dir: var
listen: 127.0.0.1:0
permit: {listen: 127.0.0.1:0, lease: 2s, renew: 1s, decision_interval: 100ms, consumer_clock_error: 200ms}
access: {tokens_file: tokens}
clock: {synchronised: required, step_limit: 100ms}

beams:
  - id: north
    launches: [{id: axis, east_m: 0, north_m: 0, up_m: 12}]
    aim_of: telescope
    guide_star: sodium
    wavelength_nm: 589.158
    power_w: 22
    aperture_m: 0.30
    focus_height_m: 92000
    asterism_radius_arcsec: 20
    limits: {elevation_min_deg: 30, elevation_max_deg: 89, sun_below_deg: -12}
    aim: {stale_after: 3s, error_arcsec: 30, unannounced_move_deg: 0.1}
    shutter_time: 500ms
    shutter_feedback: optional
    reopen_after: 5s
  - id: south
    launches: [{id: left, east_m: -4.2, north_m: -80, up_m: 9}, {id: right, east_m: 4.2, north_m: -80, up_m: 9}]
    aim_of: beam
    guide_star: {rayleigh: {from_m: 12000, until_m: 22000}}
    wavelength_nm: 532
    power_w: 40
    aperture_m: 0.25
    focus_height_m: 17000
    asterism_radius_arcsec: 120
    limits: {elevation_min_deg: 40, elevation_max_deg: 90, sun_below_deg: -12}
    aim: {stale_after: 3s, error_arcsec: 30, unannounced_move_deg: 0.1}
    shutter_time: 300ms
    shutter_feedback: required
    reopen_after: 3s

authorities:
  - {id: orbital-desk, required: true, integrity: none, lead: @LEAD@, tail: 5s, loosening: second-person, folder: lists}
  - {id: survey-office, required: false, integrity: none, lead: 2s, tail: 1s, loosening: at-once}

aircraft:
  keep_out: {half_angle_deg: 2, radius_m: 300, ceiling_m: 20000}
  motion: {horizontal_mps2: 22, vertical_mps2: 4, speed_max_mps: 350, climb_max_mps: 30}
  unlocated: alarm

sources:
  - {id: rx-1, kind: aircraft, stale_after: 10s, required: true, latency: 1s, warm_up: @WARM@, reception: {min_messages_per_min: 5}}
  - {id: rx-2, kind: aircraft, stale_after: 20s, required: false, latency: 5s, warm_up: 1m, position_error_m: 1500, vertical_error_m: 200, velocity_error_mps: 25, vertical_velocity_error_mps: 8}
  - {id: spotter-east, kind: sighting, stale_after: 15m, required: false}
  - {id: thermal-1, kind: detector, stale_after: 5s, required: true}
  - {id: catwalk, kind: interlock, stale_after: 5s, required: true}

neighbours:
  - {id: ridge-2, offset: {east_m: 140, north_m: -60, up_m: 3}, aperture_m: 8, field_radius_deg: 0.3, aim_error_arcsec: 60, stale_after: 10s, when_silent: shutter, forget_after: 10m, yields: ours, passbands_nm: [[400, 1000]]}

watches:
  - {post: east-lot, minimum: 1, shift: 2h, required: true}

feeds:
  - {kind: facts-tcp, listen: 127.0.0.1:0, sources: [north, south, ridge-2, catwalk, thermal-1, spotter-east, rx-1, rx-2]}
`

// The configurations that a night goes between. The second asks for more
// before each window, the third for as much as the first.
var leads = [...]time.Duration{5 * time.Second, 8 * time.Second, 5 * time.Second}

const warmUp = 30 * time.Second

// siteOf is the configuration with a lead, and with what was broken in it on
// purpose.
func siteOf(lead time.Duration, broken Fault) []byte {
	warm := warmUp
	switch broken {
	case FaultNoLead:
		lead = 0
	case FaultNoWarmUp:
		warm = time.Second
	}
	return []byte(strings.NewReplacer("@LEAD@", lead.String(), "@WARM@", warm.String()).Replace(siteText))
}

// Fault is something broken on purpose, to see that the judge finds it.
type Fault uint8

// The faults. The zero value is none.
const (
	NoFault          Fault = iota
	FaultIgnoreUntil       // a reader keeps its shutter open past valid_until
	FaultNoLead            // the daemon's lead is not the authority's
	FaultNoWarmUp          // the daemon's warm-up is not the site's
	FaultForget            // a restart forgets what it had acknowledged
	FaultSafe              // the interlock's line says safe whatever happens
	FaultLate              // aircraft are told a minute late, as if they were fresh
)
