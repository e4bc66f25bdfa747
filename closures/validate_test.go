package closures

import (
	"errors"
	"math"
	"reflect"
	"sort"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
)

// soundRules describes an invented site with one of everything.
func soundRules() *Rules {
	deg := func(x float64) s1.Angle { return s1.Angle(x) * s1.Degree }
	return &Rules{
		Site: SiteRules{Name: "Skerry Peak", TimeZone: "UTC", Geoid: 18,
			Position: earth.Position{Lat: deg(-31.5), Lon: deg(-4), Height: 2450},
			UT1:      sky.UT1{Offset: 30 * time.Millisecond, Until: time.Date(2031, 6, 1, 0, 0, 0, 0, time.UTC), Known: true},
			Air:      sky.Atmosphere{PressureHPa: 760, TemperatureC: 4, Known: true}},
		Permit: PermitRules{Lease: 2 * time.Second, Renew: 500 * time.Millisecond, DecisionInterval: 100 * time.Millisecond, ConsumerClockError: 200 * time.Millisecond},
		Clock:  ClockRules{StepLimit: 100 * time.Millisecond},
		Beams: []BeamRules{{ID: "north", Launches: []Launch{{ID: "axis", Offset: r3.Vector{X: 0, Y: 0, Z: 12}}},
			Wavelength: 589.158e-9, PowerW: 22, Aperture: 0.3, FocusHeight: 92e3, Asterism: 20 * geometry.Arcsecond,
			Limits:      Limits{ElevationMin: deg(30), ElevationMax: deg(89), SunBelow: deg(-12)},
			Aim:         AimRules{StaleAfter: 3 * time.Second, Error: 30 * geometry.Arcsecond, UnannouncedMove: deg(0.1)},
			ShutterTime: 500 * time.Millisecond, FeedbackStale: 5 * time.Second, ReopenAfter: 5 * time.Second}},
		Authorities: []AuthorityRules{{ID: "orbital-desk", Required: true, Lead: 5 * time.Second, Tail: 5 * time.Second, Folder: "lists", SubmitBy: "15:00"}},
		Sources: []SourceRules{
			{ID: "rx-1", Kind: AircraftSource, StaleAfter: 10 * time.Second, Required: true, Latency: time.Second, WarmUp: 30 * time.Second,
				MinMessagesPerMin: 5, ReferenceAddress: "a1b2c3", PositionError: 2000, VerticalError: 300, VelocityError: 30, VerticalVelocityErr: 10},
			{ID: "catwalk", Kind: InterlockSource, StaleAfter: 5 * time.Second, Required: true}},
		Neighbours: []NeighbourRules{{ID: "ridge-2", Offset: r3.Vector{X: 140, Y: -60, Z: 3}, Aperture: 8, Field: deg(0.3), Halo: deg(0.1), AimError: 30 * geometry.Arcsecond,
			StaleAfter: time.Minute, ForgetAfter: 10 * time.Minute, Passbands: []Band{{From: 400e-9, Until: 1000e-9}}}},
		Aircraft: AircraftRules{Configured: true, KeepOutHalfAngle: deg(2), KeepOutRadius: 300, KeepOutCeiling: 20e3,
			HorizontalAccel: 22, VerticalAccel: 4, SpeedMax: 350, ClimbMax: 30, LostAfter: time.Minute, WatchRange: 100e3, DetectionRange: 60e3},
		Watches: []WatchRules{{Post: "east-lot", Minimum: 1, Shift: 2 * time.Hour, Overlap: 5 * time.Minute, Required: true}},
	}
}

func TestValidateTakesSoundRules(t *testing.T) {
	if err := soundRules().Validate(); err != nil {
		t.Fatal(err)
	}
	edge := soundRules() // bounds themselves are inside
	b := &edge.Beams[0]
	b.Limits = Limits{ElevationMin: 30 * s1.Degree, ElevationMax: 90 * s1.Degree, SunBelow: 90 * s1.Degree}
	edge.Permit = PermitRules{Lease: MaxLease, Renew: time.Second, DecisionInterval: MaxLease / 4, ConsumerClockError: 0}
	b.ShutterTime = MaxShutterTime
	edge.Authorities[0].Lead, edge.Authorities[0].Tail = MaxLeadOrTail, 0
	edge.ByItself = AllCodes
	if err := edge.Validate(); err != nil {
		t.Fatal(err)
	}
}

func TestValidateNamesEachFault(t *testing.T) {
	for _, c := range []struct {
		spoil func(*Rules)
		want  string // the whole of one problem
	}{
		{func(r *Rules) { r.Site.Name = "" }, `site.name: "": give the site a name of at most 200 bytes`},
		{func(r *Rules) { r.Site.Position.Lat = 91 * s1.Degree }, "site.lat_deg: 91: make it -90 to 90"},
		{func(r *Rules) { r.Site.UT1.Offset = time.Second }, "site.ut1_utc_s: 1: make it -0.9 to 0.9, from the newest IERS Bulletin A or D"},
		{func(r *Rules) { r.Site.UT1.Until = time.Time{} }, "site.ut1_utc_until: say until when ut1_utc_s holds"},
		{func(r *Rules) { r.Site.Air.PressureHPa = 1013 }, "site.pressure_hpa: 1013: make it 667 to 848"},
		{func(r *Rules) { r.ByItself = 1 << NumCodes }, "rearm.by_itself: 0x200000: name codes that exist"},
		{func(r *Rules) { r.Permit.Lease = 0 }, "permit.lease: 0s: make it more than 0s and at most 10s"},
		{func(r *Rules) { r.Permit.Lease = 11 * time.Second }, "permit.lease: 11s: make it more than 0s and at most 10s"},
		{func(r *Rules) { r.Permit.Lease = 790 * time.Millisecond },
			"permit.lease: 790ms: make it at least 800ms, permit.renew with permit.decision_interval and permit.consumer_clock_error, or a good reader loses its permit between two reads"},
		{func(r *Rules) { r.Permit.DecisionInterval = 501 * time.Millisecond }, "permit.decision_interval: 501ms: make it 10ms to 500ms, a quarter of permit.lease"},
		{func(r *Rules) { r.Permit.DecisionInterval = 9 * time.Millisecond }, "permit.decision_interval: 9ms: make it 10ms to 500ms, a quarter of permit.lease"},
		{func(r *Rules) { r.Permit.ConsumerClockError = -1 }, "permit.consumer_clock_error: -1ns: make it 0s to 10s"},
		{func(r *Rules) { r.Clock.StepLimit = 0 }, "clock.step_limit: 0s: make it more than 0s and at most 1s"},
		{func(r *Rules) { r.Beams = nil }, "beams: describe at least one beam"},
		{func(r *Rules) { r.Beams[0].ID = "no/rth" }, `beams[no/rth].id: "no/rth": make it 1 to 64 of the characters A-Z a-z 0-9 . _ -`},
		{func(r *Rules) { r.Sources[1].ID = "North" }, "sources[North].id: North: choose another name: beams[north] has it, and a name denotes one thing, whatever its case"},
		{func(r *Rules) { r.Watches[0].Post = "ridge-2" }, "watches[ridge-2].post: ridge-2: choose another name: neighbours[ridge-2] has it, and a name denotes one thing, whatever its case"},
		{func(r *Rules) { r.Beams[0].Launches = nil }, "beams[north].launches: 0 entries: describe 1 to 16 launches"},
		{func(r *Rules) { r.Beams[0].Launches[0].Offset.X = 1001 }, "beams[north].launches[axis]: 1001 m east, 0 m north, 12 m up: place it within 1000 m of the site"},
		{func(r *Rules) { r.Beams[0].Launches = append(r.Beams[0].Launches, Launch{ID: "axis"}) }, "beams[north].launches[axis].id: axis: choose another name: another launch of the beam has it"},
		{func(r *Rules) { r.Beams[0].Wavelength = 589158 }, "beams[north].wavelength_nm: 5.89158e+14: make it 588.5 to 590 for a sodium star, or describe a rayleigh guide_star"},
		{func(r *Rules) { r.Beams[0].GuideStar = GuideStar{Rayleigh: true, From: 20e3, Until: 10e3} }, "beams[north].guide_star.rayleigh.until_m: 10000: make it more than from_m and at most 100000"},
		{func(r *Rules) { r.Beams[0].Asterism = s1.Degree }, "beams[north].asterism_radius_arcsec: 3600: make it 0 to less than 3600, one degree"},
		{func(r *Rules) { r.Beams[0].Limits.ElevationMax = 30 * s1.Degree }, "beams[north].limits.elevation_max_deg: 30: make it more than elevation_min_deg, 30"},
		{func(r *Rules) { r.Beams[0].Limits.ElevationMin = -1 * s1.Degree }, "beams[north].limits.elevation_min_deg: -1: make it 0 to 90"},
		{func(r *Rules) { r.Beams[0].Aim.StaleAfter = 100 * time.Millisecond }, "beams[north].aim.stale_after: 100ms: make it more than permit.decision_interval, 100ms, and at most 5m"},
		{func(r *Rules) { r.Beams[0].ShutterTime = 0 }, "beams[north].shutter_time: 0s: make it more than 0s and at most 30s"},
		{func(r *Rules) { r.Beams[0].ShutterTime = 31 * time.Second }, "beams[north].shutter_time: 31s: make it more than 0s and at most 30s"},
		{func(r *Rules) { r.Authorities[0].Lead = -time.Second }, "authorities[orbital-desk].lead: -1s: make it 0s to 1h"},
		{func(r *Rules) { r.Authorities[0].Tail = 2 * time.Hour }, "authorities[orbital-desk].tail: 2h: make it 0s to 1h"},
		{func(r *Rules) { r.Authorities[0].Integrity = 9 }, "authorities[orbital-desk].integrity: 9: make it digest, count or none"},
		{func(r *Rules) { r.Authorities[0].SubmitBy = "24:00" }, `authorities[orbital-desk].submit_by: "24:00": make it hh:mm in the site's zone, "00:00" to "23:59"`},
		{func(r *Rules) { r.Authorities = append(r.Authorities, AuthorityRules{ID: "b", Folder: "lists"}) }, "authorities[b].folder: lists: choose another folder: orbital-desk has it, and a list must not be read for two authorities"},
		{func(r *Rules) { r.Sources[1].Kind = NoKind }, "sources[catwalk].kind: make it one of aircraft, sighting, detector, interlock, weather"},
		{func(r *Rules) { r.Sources[1].Latency = time.Second }, "sources[catwalk].kind: interlock: leave latency, warm_up, reception and the error bounds to sources of kind aircraft"},
		{func(r *Rules) { r.Sources[1].StaleAfter = 0 }, "sources[catwalk].stale_after: 0s: make it more than permit.decision_interval, 100ms, and at most 24h"},
		{func(r *Rules) { r.Sources[0].Latency = 11 * time.Second }, "sources[rx-1].stale_after: 10s: make it at least the source's latency, 11s"},
		{func(r *Rules) { r.Sources[0].ReferenceAddress = "A1B2C3" }, `sources[rx-1].reception.reference_address: "A1B2C3": make it a 24-bit address: six digits of 0-9 a-f`},
		{func(r *Rules) { r.Sources = r.Sources[1:] }, "aircraft: described: add a source of kind aircraft, or take the section out"},
		{func(r *Rules) { r.Aircraft = AircraftRules{} }, "aircraft: describe keep_out and motion: sources[rx-1] tells of aircraft"},
		{func(r *Rules) { r.Aircraft.DetectionRange = 30e3 }, "aircraft.detection_range_m: 30000: make it at least 37683, where the keep-out of beam north passes its ceiling at the lowest elevation"},
		{func(r *Rules) { r.Aircraft.WatchRange = 50e3 }, "aircraft.watch_range_m: 50000: make it at least detection_range_m, 60000, and at most 1000000"},
		{func(r *Rules) { r.Aircraft.LostAfter = time.Second }, "aircraft.lost_after: 1s: make it at least 2700ms, the longest lease with its margin time, and at most 1h"},
		{func(r *Rules) { r.Neighbours[0].Offset.Y = 201e3 }, "neighbours[ridge-2].offset: 140 m east, 201000 m north, 3 m up: place it within 200000 m of the site"},
		{func(r *Rules) { r.Neighbours[0].ForgetAfter = time.Second }, "neighbours[ridge-2].forget_after: 1s: make it at least stale_after, 1m, and at most 24h"},
		{func(r *Rules) { r.Neighbours[0].Field = 0 }, "neighbours[ridge-2].field_radius_deg: 0: make it more than 0 and at most 10"},
		{func(r *Rules) { r.Neighbours[0].Passbands[0].Until = 300e-9 }, "neighbours[ridge-2].passbands_nm: [400, 300]: make each a rising pair of wavelengths from 100 to 100000"},
		{func(r *Rules) { r.Watches[0].Minimum = 0 }, "watches[east-lot].minimum: 0: make it 1 to 20 people"},
		{func(r *Rules) { r.Watches[0].Overlap = 2 * time.Hour }, "watches[east-lot].overlap: 2h: make it 0s to less than the shift, 2h"},
	} {
		r := soundRules()
		c.spoil(r)
		err := r.Validate()
		var ps Problems
		if !errors.As(err, &ps) {
			t.Errorf("want %q, got %v", c.want, err)
			continue
		}
		found := false
		for _, p := range ps {
			found = found || p.String() == c.want
		}
		if !found {
			t.Errorf("want %q, got\n%v", c.want, err)
		}
	}
}

func TestValidateGivesEveryProblemInOrder(t *testing.T) {
	r := soundRules()
	r.Permit.Lease = 0
	r.Beams[0].PowerW = -1
	r.Beams[0].ShutterTime = 0
	r.Watches[0].Minimum = 0
	var ps Problems
	if !errors.As(r.Validate(), &ps) || len(ps) != 4 {
		t.Fatalf("want 4 problems, got\n%v", r.Validate())
	}
	if !sort.SliceIsSorted(ps, func(i, j int) bool { return ps[i].Key < ps[j].Key }) {
		t.Errorf("not in order of the keys:\n%v", ps)
	}
	if n := len(strings.Split(ps.Error(), "\n")); n != 4 {
		t.Errorf("want a line each, got %d", n)
	}
}

func TestValidateRefusesNoRules(t *testing.T) {
	var none *Rules
	if none.Validate() == nil {
		t.Error("nil rules are taken")
	}
	if new(Rules).Validate() == nil {
		t.Error("zero rules are taken")
	}
}

// Every number of the rules, set to what is not a number or has no end, is
// refused: a check that computes with it could not be trusted.
func TestValidateRefusesWhatIsNotFinite(t *testing.T) {
	count := 0
	var walk func(path string, v reflect.Value, visit func(string, reflect.Value))
	walk = func(path string, v reflect.Value, visit func(string, reflect.Value)) {
		switch v.Kind() {
		case reflect.Float64:
			visit(path, v)
		case reflect.Struct:
			if _, ok := v.Interface().(time.Time); ok {
				return
			}
			for i := 0; i < v.NumField(); i++ {
				if v.Field(i).CanSet() {
					walk(path+"."+v.Type().Field(i).Name, v.Field(i), visit)
				}
			}
		case reflect.Slice:
			for i := 0; i < v.Len(); i++ {
				walk(path+"[]", v.Index(i), visit)
			}
		}
	}
	r := soundRules()
	walk("", reflect.ValueOf(r).Elem(), func(path string, v reflect.Value) {
		was := v.Float()
		for _, x := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
			v.SetFloat(x)
			if r.Validate() == nil {
				t.Errorf("%s = %v is taken", path, x)
			}
		}
		v.SetFloat(was)
		count++
	})
	if err := r.Validate(); err != nil {
		t.Fatal(err)
	}
	if count < 35 {
		t.Errorf("only %d numbers were tried", count)
	}
}
