package demo

import (
	"fmt"
	"time"

	"github.com/golang/geo/s1"

	"beamward/geometry/earth"
	"beamward/geometry/sky"
)

// skerry is where the invented observatory stands.
var skerry = earth.Position{Lat: -31.5012 * s1.Degree, Lon: -4.0021 * s1.Degree, Height: 2450}

// evening names the night, of which the demo plays the end.
var evening = time.Date(2031, 2, 14, 12, 0, 0, 0, time.UTC)

// sunLimit is the beams' limit of the Sun. It is reached when the story ends.
const sunLimit = -12 * s1.Degree

// siteText is the configuration. Times that a site would set to minutes are
// seconds here, so that much happens in little time; leads and margins are of
// the size that they have in earnest.
func siteText(listen string) string {
	return fmt.Sprintf(`# Skerry Peak, an invented observatory, as the demo plays it. No real place,
# authority, telescope or aircraft is meant.

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
listen: %s
permit: {listen: 127.0.0.1:0, lease: 2s, renew: 500ms, decision_interval: 100ms, consumer_clock_error: 200ms}
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
    shutter_feedback: required
    reopen_after: 2s
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
    aim: {stale_after: 3s, error_arcsec: 10, unannounced_move_deg: 0.1}
    shutter_time: 300ms
    shutter_feedback: required
    reopen_after: 2s

authorities:
  - {id: orbital-desk, required: true, integrity: count, lead: 2s, tail: 1s, loosening: confirm, folder: lists, phone: "+00 000 0000", submit_by: "15:00"}
  - {id: survey-office, required: false, integrity: none, lead: 2s, tail: 1s, loosening: at-once}

aircraft:
  keep_out: {half_angle_deg: 2, radius_m: 300, ceiling_m: 20000}
  motion: {horizontal_mps2: 22, vertical_mps2: 4, speed_max_mps: 350, climb_max_mps: 30}
  unlocated: shutter
  lost_after: 10s

sources:
  - {id: rx-1, kind: aircraft, stale_after: 4s, required: true, latency: 1s, warm_up: 5s, reception: {min_messages_per_min: 5}}
  - {id: spotter-east, kind: sighting, stale_after: 15m, required: false}
  - {id: thermal-1, kind: detector, stale_after: 5s, required: true}
  - {id: catwalk, kind: interlock, stale_after: 5s, required: true}
  - {id: mast, kind: weather, stale_after: 10m, required: false}

neighbours:
  - {id: ridge-2, offset: {east_m: 140, north_m: -60, up_m: 3}, aperture_m: 8, field_radius_deg: 0.3, stale_after: 10s, when_silent: shutter, forget_after: 10m, yields: ours, passbands_nm: [[400, 1000]]}

watches:
  - {post: east-lot, minimum: 1, shift: 2h, required: true}

feeds:
  - {kind: facts-tcp, listen: 127.0.0.1:0, sources: [north, south, ridge-2]}
  - {kind: facts-tcp, listen: 127.0.0.1:0, sources: [rx-1]}
  - {kind: facts-tcp, listen: 127.0.0.1:0, sources: [catwalk, thermal-1]}
`, listen)
}

// The feeds in their order above.
const (
	telescopeFeed = iota
	receiverFeed
	safetyFeed
	numFeeds
)

// dawn returns when the Sun passes the beams' limit, to the second below.
func dawn() (time.Time, error) {
	from, until := evening.Add(12*time.Hour), evening.Add(20*time.Hour)
	above := func(at time.Time) (bool, error) {
		n, err := sky.Prepare(skerry, at, sky.UT1{})
		if err != nil {
			return false, fmt.Errorf("looking for the dawn of Skerry Peak: %w", err)
		}
		return elevation(n.Sun(at)) >= sunLimit, nil
	}
	for until.Sub(from) > time.Second {
		middle := from.Add(until.Sub(from) / 2)
		up, err := above(middle)
		if err != nil {
			return time.Time{}, err
		}
		if up {
			until = middle
		} else {
			from = middle
		}
	}
	return from.Truncate(time.Second), nil
}
