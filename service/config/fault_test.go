package config_test

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"beamward/service/config"
)

const site = "../../testdata/site/"

// Each file holds one fault; the text is all that an operator is told.
var faults = map[string]string{
	"access-for-nobody":       `line 22: access: state tokens_file or certificates, or take the section out`,
	"aim-stale-at-once":       `line 16: beams[north].aim.stale_after: 100ms: make it more than permit.decision_interval, 100ms, and at most 5m`,
	"aircraft-source-alone":   `line 21: aircraft: describe keep_out and motion: sources[rx-1] tells of aircraft`,
	"aircraft-without-source": `line 22: aircraft: described: add a source of kind aircraft, or take the section out`,
	"alerts-not-served":       `line 22: alerts: there is no such key: make it one of access, aircraft, authorities, beams, clock, data_dir, feeds, layouts, listen, neighbours, permit, rearm, retention, site, sources, tls, watches`,
	"alias": `line 19: &five: take it out: anchors are not read` + "\n" +
		`line 19: *five: write the value out: aliases are not read`,
	"anchor":                        `line 19: &five: take it out: anchors are not read`,
	"api-on-every-interface":        `line 2: listen: :8460: make it a loopback address, or add tls and access: open access off loopback is refused`,
	"api-open-to-all":               `line 2: listen: 0.0.0.0:8460: make it a loopback address, or add tls and access: open access off loopback is refused`,
	"asterism-too-wide":             `line 14: beams[north].asterism_radius_arcsec: 3600: make it 0 to less than 3600, one degree`,
	"block-of-text":                 `line 8: write the value on one line: blocks of text are not read`,
	"byte-order-mark":               `line 1: the text is not plain UTF-8: save it as UTF-8 without a byte order mark`,
	"certificate-feed-unbound":      `line 23: access.certificates[bus].sources: name what it may speak for`,
	"certificate-matched-twice":     `line 23: access.certificates[desk]: state exactly one of common_name, dns, email and uri`,
	"certificate-name-twice":        `line 23: access.certificates[Desk].name: Desk: choose another name: another certificate has it`,
	"certificate-of-two-people":     `line 23: access.certificates[night].email: desk@skerry.invalid: another name has this certificate already`,
	"certificate-role":              `line 23: access.certificates[bus].role: root: make it read, feed, operate or admin`,
	"certificate-without-authority": `line 23: access.certificates: add tls.client_ca_file: nothing else vouches for a client certificate`,
	"control-character":             `line 1: site.name: "Skerry\tPeak": write 1 to 200 printable characters on one line`,
	"decisions-too-slow":            `line 3: permit.decision_interval: 600ms: make it 10ms to 500ms, a quarter of permit.lease`,
	"doubled-key":                   `line 12: beams[north].power_w: the key stands twice: keep one`,
	"duration-compound":             `line 17: beams[north].shutter_time: 1m30s: write a whole number and one unit of ms, s, m, h, d, such as 500ms or 10m`,
	"duration-fraction":             `line 17: beams[north].shutter_time: 0.5s: write a whole number and one unit of ms, s, m, h, d, such as 500ms or 10m`,
	"duration-negative":             `line 19: authorities[orbital-desk].lead: -5s: write a whole number and one unit of ms, s, m, h, d, such as 500ms or 10m`,
	"duration-without-unit":         `line 3: permit.lease: 2: write a whole number and one unit of ms, s, m, h, d, such as 500ms or 10m`,
	"empty":                         `the text is empty`,
	"feed-certificate-of-nobody":    `line 22: feeds[#1].admits: certificate: add access.certificates with tls.client_ca_file`,
	"feed-kind-unknown":             `line 22: feeds[#1].kind: facts-http: make it facts-tcp, facts-udp, facts-file, mode-s or asterix-021`,
	"feed-mode-s-interlock":         `line 22: feeds[#1].source: catwalk: name a source of kind aircraft: this feed carries nothing else`,
	"feed-of-unknown-source":        `line 22: feeds[#1].sources[#1]: catwolk: name a source, beam, neighbour or post that the file describes`,
	"feed-open-to-all":              `line 22: feeds[#1].listen: 192.0.2.10:8470: make it a loopback address, or make admits token or certificate: off loopback anyone could speak for these sources`,
	"feed-token-in-the-clear":       `line 23: feeds[#1].admits: token: add tls: a token must not cross the network in the clear`,
	"feed-twice-for-one-source":     `line 22: feeds[#2].sources[#1]: catwalk: give it one feed: feeds[#1] carries it already, and would hide that this one is silent`,
	"feed-two-ways-in":              `line 24: feeds[#1]: state one of dial and file`,
	"feed-udp-interlock":            `line 22: feeds[#1].sources[#1]: catwalk: name a source of kind aircraft: over UDP a sender proves nothing, so it may say nothing that opens`,
	"feed-unbound":                  `line 22: feeds[#1].sources: name what it may speak for: a feed is bound to sources`,
	"flag-yes":                      `line 19: authorities[orbital-desk].required: yes: make it true or false, without quotes`,
	"folder-shared":                 `line 20: authorities[survey-office].folder: lists: choose another folder: orbital-desk has it, and a list must not be read for two authorities`,
	"guide-star-unknown":            `line 9: beams[north].guide_star: potassium: make it sodium or {rayleigh: {from_m: 10000, until_m: 20000}}`,
	"instant-leap-second":           `line 1: site.ut1_utc_until: 2031-06-30T23:59:60Z: write UTC as YYYY-MM-DDThh:mm:ssZ, with up to three decimals of a second`,
	"instant-with-offset":           `line 1: site.ut1_utc_until: 2031-06-01T00:00:00+01:00: write UTC as YYYY-MM-DDThh:mm:ssZ, with up to three decimals of a second`,
	"key-is-the-certificate":        `line 22: tls.key_file: a.pem: name another file than cert_file`,
	"key-of-another-kind":           `line 21: sources[catwalk].latency: take it out: it belongs to kind aircraft`,
	"launch-far-off":                `line 7: beams[north].launches[axis]: 0 m east, 0 m north, 2450 m up: place it within 1000 m of the site`,
	"layout-not-described":          `line 19: authorities[orbital-desk].layout: survey: name an entry of layouts, or leave it out for native lists`,
	"lead-too-long":                 `line 19: authorities[orbital-desk].lead: 2h: make it 0s to 1h`,
	"lease-too-long":                `line 3: permit.lease: 11s: make it more than 0s and at most 10s`,
	"lease-under-renewal":           `line 3: permit.lease: 2s: make it at least 2300ms, permit.renew with permit.decision_interval and permit.consumer_clock_error, or a good reader loses its permit between two reads`,
	"limit-over-the-zenith":         `line 15: beams[north].limits.elevation_max_deg: 91: make it 0 to 90`,
	"limits-crossed":                `line 15: beams[north].limits.elevation_max_deg: 29: make it more than elevation_min_deg, 30`,
	"list-at-the-top":               `line 1: write keys and values here: access, aircraft, authorities, beams, clock, data_dir, feeds, layouts, listen, neighbours, permit, rearm, retention, site, sources, tls, watches`,
	"list-for-a-value":              `line 11: beams[north].power_w: write one value here`,
	"listen-by-name":                `line 2: listen: skerry.invalid:8460: write an IP address, or localhost, and a port, such as 127.0.0.1:8460 or [::1]:8460`,
	"merge-key":                     `line 21: <<: write the keys out: merge keys are not read`,
	"missing-key":                   `line 15: beams[north].limits.sun_below_deg: it is missing: the Sun's centre must be lower than this elevation; 90 is no limit`,
	"missing-section":               `line 6: beams[north].limits: it is missing: the beam's standing limits`,
	"name-in-another-case":          `line 21: sources[Orbital-Desk].id: Orbital-Desk: choose another name: authorities[orbital-desk] has it, and a name denotes one thing, whatever its case`,
	"name-used-twice":               `line 21: sources[north].id: north: choose another name: beams[north] has it, and a name denotes one thing, whatever its case`,
	"name-with-slash":               `line 21: sources[#1].id: cat/walk: make it 1 to 64 of the characters A-Z a-z 0-9 . _ -`,
	"neighbour-forgotten-early":     `line 22: neighbours[ridge-2].forget_after: 30s: make it at least stale_after, 1m, and at most 24h`,
	"neighbour-nowhere":             `line 22: neighbours[ridge-2]: state one of offset and position`,
	"no-value":                      `line 4: clock.step_limit: it has no value: write one, or leave the key out`,
	"not-yaml":                      `line 1: this is not YAML: did not find expected ',' or '}'`,
	"number-in-octal":               `line 11: beams[north].power_w: 022: write a decimal number, such as -31.5, without quotes, exponent or unit`,
	"number-in-quotes":              `line 11: beams[north].power_w: "22": write a decimal number, such as -31.5, without quotes, exponent or unit`,
	"number-not-a-number":           `line 11: beams[north].power_w: .nan: write a decimal number, such as -31.5, without quotes, exponent or unit`,
	"number-with-exponent":          `line 13: beams[north].focus_height_m: 9.2e4: write a decimal number, such as -31.5, without quotes, exponent or unit`,
	"number-with-underscore":        `line 13: beams[north].focus_height_m: 92_000: write a decimal number, such as -31.5, without quotes, exponent or unit`,
	"number-with-unit":              `line 12: beams[north].aperture_m: 0.30 m: write a decimal number, such as -31.5, without quotes, exponent or unit`,
	"number-without-end":            `line 14: beams[north].asterism_radius_arcsec: .inf: write a decimal number, such as -31.5, without quotes, exponent or unit`,
	"passband-falling":              `line 22: neighbours[ridge-2].passbands_nm: [1000, 400]: make each a rising pair of wavelengths from 100 to 100000`,
	"permit-open-to-all":            `line 3: permit.listen: 192.0.2.10:8461: make it a loopback address, or add tls and access: open access off loopback is refused`,
	"poll-not-served":               `line 22: poll: there is no such key: make it one of access, aircraft, authorities, beams, clock, data_dir, feeds, layouts, listen, neighbours, permit, rearm, retention, site, sources, tls, watches`,
	"port-out-of-range":             `line 2: listen: 127.0.0.1:65536: write an IP address, or localhost, and a port, such as 127.0.0.1:8460 or [::1]:8460`,
	"port-taken":                    `line 3: permit.listen: 127.0.0.1:8460: choose another port: listen has it`,
	"pressure-at-sea-level":         `line 1: site.pressure_hpa: 1013: make it 667 to 848`,
	"rayleigh-heights-crossed":      `line 9: beams[north].guide_star.rayleigh.until_m: 10000: make it more than from_m and at most 100000`,
	"rearm-no-cause":                `line 22: rearm.by_itself: rearm: make each one of listed-closure, not-covered, aircraft, sighting, detector-alarm, field-crossing, hold, interlock, watch-missing, elevation-limit, daylight, aim-unknown, slewing, source-silent, clock, record, shutter-fault, starting, fault`,
	"record-too-short":              `line 22: retention.keep_facts: 1d: make it at least 2d, so that a night can be explained`,
	"schedule-not-served":           `line 22: schedule: there is no such key: make it one of access, aircraft, authorities, beams, clock, data_dir, feeds, layouts, listen, neighbours, permit, rearm, retention, site, sources, tls, watches`,
	"second-person-nobody":          `line 19: authorities[orbital-desk].loosening: second-person: nobody signs in by name: add access.tokens_file, or make it confirm or at-once`,
	"shutter-takes-no-time":         `line 17: beams[north].shutter_time: 0s: make it more than 0s and at most 30s`,
	"shutter-too-slow":              `line 17: beams[north].shutter_time: 31s: make it more than 0s and at most 30s`,
	"submit-by-midnight":            `line 19: authorities[orbital-desk].submit_by: 24:00: write hh:mm, "00:00" to "23:59"`,
	"tag":                           `line 11: !!float: take it out: tags are not read`,
	"temperature-without-pressure":  `line 1: site.pressure_hpa: it is missing: it goes with temperature_c`,
	"token-in-the-clear":            `line 2: listen: 192.0.2.10:8460: make it a loopback address, or add tls: a token must not cross the network in the clear`,
	"track-lost-in-the-keep-out":    `line 23: aircraft.detection_range_m: 30000: make it at least 37683, where the keep-out of beam north passes its ceiling at the lowest elevation`,
	"two-documents":                 `line 22: a second document starts here: keep to one`,
	"unknown-key":                   `line 3: permit.leese: there is no such key: did you mean lease?`,
	"unknown-section":               `line 22: weather: there is no such key: make it one of access, aircraft, authorities, beams, clock, data_dir, feeds, layouts, listen, neighbours, permit, rearm, retention, site, sources, tls, watches`,
	"ut1-without-end":               `line 1: site.ut1_utc_until: it is missing: it goes with ut1_utc_s`,
	"watch-of-nobody":               `line 22: watches[east-lot].minimum: 0: make it 1 to 20 people`,
	"wavelength-in-metres":          `line 10: beams[north].wavelength_nm: 0.000000589158: make it 588.5 to 590 for a sodium star, or describe a rayleigh guide_star`,
	"word":                          `line 8: beams[north].aim_of: mount: make it beam or telescope`,
	"zone-of-the-machine":           `line 1: site.time_zone: Local: name a zone of the IANA database, such as Atlantic/St_Helena, or UTC`,
	"zone-unknown":                  `line 1: site.time_zone: Atlantic/Skerry: name a zone of the IANA database, such as Atlantic/St_Helena, or UTC`,
}

// BW-027
func TestEveryFaultIsToldWithItsMend(t *testing.T) {
	if len(faults) < 40 {
		t.Fatalf("only %d faults are tried", len(faults))
	}
	files, err := os.ReadDir(site + "bad")
	if err != nil {
		t.Fatal(err)
	}
	for _, f := range files {
		if _, ok := faults[strings.TrimSuffix(f.Name(), ".yaml")]; !ok {
			t.Errorf("%s: no message is expected", f.Name())
		}
	}
	for name, want := range faults {
		path := filepath.Join(site+"bad", name+".yaml")
		c, err := config.Load(path)
		if err == nil || c != nil {
			t.Errorf("%s is taken", name)
			continue
		}
		if got := strings.ReplaceAll(err.Error(), "config "+path+": ", ""); got != want {
			t.Errorf("%s:\n got %s\nwant %s", name, got, want)
		}
	}
}
