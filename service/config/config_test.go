package config_test

import (
	"crypto/sha256"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"
	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/earth"
	"beamward/geometry/sky"
	"beamward/service/config"
)

func load(t *testing.T, name string) *config.Config {
	t.Helper()
	c, err := config.Load(site + name)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func text(t *testing.T, name string) string {
	t.Helper()
	b, err := os.ReadFile(site + name)
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

// parse takes a small text that is sound but for what the test puts into it.
func parse(s string) (*config.Config, error) { return config.Parse([]byte(s), "/site") }

func TestTheSmallSite(t *testing.T) {
	c := load(t, "beamward.yaml")
	deg := s1.Degree
	want := &closures.Rules{
		Site: closures.SiteRules{Name: "Skerry Peak", TimeZone: "Atlantic/St_Helena", Geoid: 18,
			Position: earth.Position{Lat: -31.5012 * deg, Lon: -4.0021 * deg, Height: 2450}},
		Permit: closures.PermitRules{Lease: 2 * time.Second, Renew: 500 * time.Millisecond,
			DecisionInterval: 100 * time.Millisecond, ConsumerClockError: 200 * time.Millisecond},
		Clock: closures.ClockRules{Synchronised: closures.SyncAssumed, StepLimit: 100 * time.Millisecond},
		ByItself: closures.Codes(0).With(closures.CodeListedClosure).With(closures.CodeNotCovered).With(closures.CodeHold).
			With(closures.CodeElevationLimit).With(closures.CodeDaylight).With(closures.CodeAimUnknown).With(closures.CodeSlewing).
			With(closures.CodeSourceSilent).With(closures.CodeStarting).With(closures.CodeInterlock).With(closures.CodeClock).With(closures.CodeRecord),
		Beams: []closures.BeamRules{{
			ID: "north", Launches: []closures.Launch{{ID: "axis", Offset: r3.Vector{Z: 12}}}, AimOfTelescope: true,
			Wavelength: 589.158e-9, PowerW: 22, Aperture: 0.30, FocusHeight: 92000, Asterism: 20 * geometry.Arcsecond,
			Limits:      closures.Limits{ElevationMin: 30 * deg, ElevationMax: 89 * deg, SunBelow: 90 * deg},
			Aim:         closures.AimRules{StaleAfter: 3 * time.Second, Error: 30 * geometry.Arcsecond, UnannouncedMove: 0.1 * deg},
			ShutterTime: 500 * time.Millisecond, FeedbackStale: 5 * time.Second, ReopenAfter: 5 * time.Second,
		}},
		Authorities: []closures.AuthorityRules{{ID: "orbital-desk", Required: true, Integrity: closures.IntegrityNone,
			Lead: 5 * time.Second, Tail: 5 * time.Second, Loosening: closures.LooseningAtOnce, Folder: "lists"}},
		Sources: []closures.SourceRules{{ID: "catwalk", Kind: closures.InterlockSource, StaleAfter: 5 * time.Second, Required: true}},
		Digest:  sha256.Sum256(c.Canonical()),
	}
	if d := cmp.Diff(want, c.Rules, cmpopts.EquateApprox(1e-15, 0)); d != "" {
		t.Error(d)
	}
	dir, err := filepath.Abs(site)
	if err != nil {
		t.Fatal(err)
	}
	if c.DataDir != filepath.Join(dir, "var") || c.Listen != "127.0.0.1:8460" || c.PermitListen != "127.0.0.1:8461" {
		t.Errorf("data_dir %s, listen %s, permit %s", c.DataDir, c.Listen, c.PermitListen)
	}
	if want := []config.Folder{{Authority: "orbital-desk", Path: filepath.Join(dir, "lists")}}; !cmp.Equal(want, c.Folders) {
		t.Errorf("folders %+v", c.Folders)
	}
	if c.Access.Named() || c.TLS.On() || len(c.Feeds) != 0 || c.Zone.String() != "Atlantic/St_Helena" || c.Retention.KeepFacts != 400*24*time.Hour {
		t.Errorf("access %+v, tls %+v, feeds %+v, zone %v, retention %+v", c.Access, c.TLS, c.Feeds, c.Zone, c.Retention)
	}
	if string(c.Text) != text(t, "beamward.yaml") {
		t.Error("the text is not kept as it was")
	}
}

func TestTheFullSite(t *testing.T) {
	c, err := parse(text(t, "full.yaml"))
	if err != nil {
		t.Fatal(err)
	}
	r := c.Rules
	if want := (sky.UT1{Offset: 30 * time.Millisecond, Until: time.Date(2031, 6, 1, 0, 0, 0, 0, time.UTC), Known: true}); r.Site.UT1 != want {
		t.Errorf("UT1 %+v", r.Site.UT1)
	}
	if want := (sky.Atmosphere{PressureHPa: 760, TemperatureC: 4, Known: true}); r.Site.Air != want {
		t.Errorf("air %+v", r.Site.Air)
	}
	if g := r.Beam("south").GuideStar; g != (closures.GuideStar{Rayleigh: true, From: 12000, Until: 22000}) {
		t.Errorf("guide star %+v", g)
	}
	if !r.Beam("south").FeedbackRequired || r.Beam("south").AimOfTelescope {
		t.Error("beam south: words are lost")
	}
	if a := r.Authority("orbital-desk"); a.Integrity != closures.IntegrityCount || a.Loosening != closures.LooseningSecondPerson || a.SubmitBy != "15:00" {
		t.Errorf("authority %+v", a)
	}
	if s := r.Source("rx-1"); s.Latency != time.Second || s.MinMessagesPerMin != 5 || s.ReferenceAddress != "a1b2c3" || s.PositionError != 2000 {
		t.Errorf("source %+v", s)
	}
	if s := r.Source("rx-3"); !s.Required || s.Latency != 5*time.Second || s.WarmUp != 30*time.Second {
		t.Errorf("defaults of an aircraft source: %+v", s)
	}
	// The far dome by its distance: 0.2188° of latitude and 0.0921° of
	// longitude at 31.6° south are 24.26 km and 8.74 km on WGS 84.
	if d := r.Neighbour("far-dome").Offset; d.Norm() < 25.6e3 || d.Norm() > 26.0e3 || d.Y > -24e3 || d.X < 8.6e3 {
		t.Errorf("far-dome at %v", d)
	}
	if n := r.Neighbour("far-dome"); !n.IgnoreSilent || n.Yields != closures.YieldsLater || !n.OnlyExposing {
		t.Errorf("neighbour %+v", n)
	}
	if p := r.Neighbour("ridge-2").Passbands; len(p) != 2 || float64(p[1].From) != 1100.5*1e-9 {
		t.Errorf("passbands %v", p)
	}
	if !r.Aircraft.Configured || r.Aircraft.Unlocated != closures.UnlocatedAlarm {
		t.Errorf("aircraft %+v", r.Aircraft)
	}
	if want := (config.Feed{Kind: config.ModeS, Dial: "192.0.2.20:30002", Sources: []closures.Source{"rx-1"}}); !cmp.Equal(c.Feeds[3], want) {
		t.Errorf("feed %+v", c.Feeds[3])
	}
	if want := (config.Feed{Kind: config.FactsFile, File: "/site/feeds/south.ndjson", Sources: []closures.Source{"south"}}); !cmp.Equal(c.Feeds[6], want) {
		t.Errorf("feed %+v", c.Feeds[6])
	}
	if c.Access.TokensFile != "/site/access/tokens" || len(c.Access.Certificates) != 4 || c.Access.Certificates[3].URI != "spiffe://skerry.invalid/duty" {
		t.Errorf("access %+v", c.Access)
	}
	if c.TLS != (config.TLS{CertFile: "/site/tls/skerry.pem", KeyFile: "/site/tls/skerry.key", ClientCAFile: "/site/tls/clients.pem"}) {
		t.Errorf("tls %+v", c.TLS)
	}
	if c.Layouts["survey-report"] != "/site/layouts/survey-report.yaml" || c.Folders[1].Layout != "survey-report" {
		t.Errorf("layouts %v, folders %v", c.Layouts, c.Folders)
	}
}

func TestWhatIsLeftOutIsTheSafeDefault(t *testing.T) {
	c, err := parse(smallest)
	if err != nil {
		t.Fatal(err)
	}
	r := c.Rules
	b, a, s := &r.Beams[0], &r.Authorities[0], &r.Sources[0]
	if !b.FeedbackRequired || !a.Required || a.Integrity != closures.IntegrityDigest || !s.Required || r.Clock.Synchronised != closures.SyncRequired {
		t.Errorf("beam %+v, authority %+v, source %+v, clock %+v", b, a, s, r.Clock)
	}
	for _, code := range []closures.Code{closures.CodeStarting, closures.CodeInterlock, closures.CodeDetectorAlarm, closures.CodeShutterFault,
		closures.CodeWatchMissing, closures.CodeClock, closures.CodeRecord, closures.CodeFault} {
		if r.ByItself.Has(code) {
			t.Errorf("after %v a beam opens by itself", code)
		}
	}
}

func TestRearmAll(t *testing.T) {
	c, err := parse(smallest + "rearm: {by_itself: all}\n")
	if err != nil {
		t.Fatal(err)
	}
	if c.Rules.ByItself != closures.AllCodes {
		t.Errorf("by itself: %v", c.Rules.ByItself.Names())
	}
	again, err := parse(string(c.Canonical()))
	if err != nil || again.Rules.ByItself != closures.AllCodes {
		t.Errorf("again: %v, %v", again, err)
	}
}

func TestAllProblemsAtOnce(t *testing.T) {
	s := strings.NewReplacer("power_w: 22", "power_w: -1", "shutter_time: 500ms", "shutter_time: 31 s", "lead: 5s", "lead: 2h",
		"kind: interlock", "kind: interlok").Replace(smallest) + "feeds: [{kind: facts-tcp, listen: 192.0.2.1:1, sources: [north]}]\nalarms: {}\n"
	_, err := parse(s)
	var e *config.Error
	if !errors.As(err, &e) {
		t.Fatal(err)
	}
	// The beam's shutter_time cannot be read, so that its power is not judged.
	for _, want := range []string{"shutter_time: 31 s", "lead: 2h", "kind: interlok", "feeds[#1].listen", "alarms"} {
		if !strings.Contains(err.Error(), want) {
			t.Errorf("%s is not told:\n%v", want, err)
		}
	}
	if len(e.Problems) != 5 {
		t.Errorf("want 5 problems:\n%v", err)
	}
	for i, p := range e.Problems {
		if p.Line == 0 || p.Mend == "" || (i > 0 && p.Line < e.Problems[i-1].Line) {
			t.Errorf("problem %+v has no line or mend, or is out of order", p)
		}
	}
}

func TestLoadSaysWhichFileIsMissing(t *testing.T) {
	_, err := config.Load(filepath.Join(t.TempDir(), "none.yaml"))
	if !errors.Is(err, os.ErrNotExist) || !strings.Contains(err.Error(), "none.yaml") {
		t.Error(err)
	}
}

const smallest = `site: {name: Skerry Peak, time_zone: UTC, lat_deg: -31.5, lon_deg: -4, height_m: 2450, geoid_height_m: 18}
beams:
  - id: north
    launches: [{id: axis, east_m: 0, north_m: 0, up_m: 12}]
    aim_of: beam
    guide_star: sodium
    wavelength_nm: 589.158
    power_w: 22
    aperture_m: 0.3
    focus_height_m: 92000
    asterism_radius_arcsec: 0
    limits: {elevation_min_deg: 30, elevation_max_deg: 89, sun_below_deg: -12}
    aim: {stale_after: 3s, error_arcsec: 30}
    shutter_time: 500ms
authorities: [{id: orbital-desk, lead: 5s, tail: 5s, loosening: confirm}]
sources: [{id: catwalk, kind: interlock, stale_after: 5s}]
`
