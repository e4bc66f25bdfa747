// Package deploy_test checks that what an installation is given fits the
// program.
package deploy_test

import (
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"gopkg.in/yaml.v3"

	"beamward/service/config"
)

// The example site loads as it is.
func TestExampleLoads(t *testing.T) {
	c, err := config.Load("example/beamward.yaml")
	if err != nil {
		t.Fatal(err)
	}
	if c.Rules.Site.Name != "Skerry Peak" {
		t.Errorf("the example is of %q", c.Rules.Site.Name)
	}
}

// Each alert asks for figures that the service has, and for reasons that exist,
// and says what to do.
func TestAlertRules(t *testing.T) {
	text, err := os.ReadFile("prometheus/beamward-alerts.yml")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Groups []struct {
			Name  string
			Rules []struct {
				Alert       string
				Expr        string
				For         string
				Labels      map[string]string
				Annotations map[string]string
			}
		}
	}
	if err := yaml.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	source, err := os.ReadFile("../service/metrics/metrics.go")
	if err != nil {
		t.Fatal(err)
	}
	codes, err := os.ReadFile("../closures/code.go")
	if err != nil {
		t.Fatal(err)
	}
	name, reason := regexp.MustCompile(`beamward_([a-z_]+)`), regexp.MustCompile(`reason="([a-z-]+)"`)
	n := 0
	for _, g := range file.Groups {
		for _, r := range g.Rules {
			n++
			if r.Labels["severity"] == "" || r.Annotations["summary"] == "" || r.Annotations["action"] == "" {
				t.Errorf("%s: severity, summary or action is missing", r.Alert)
			}
			for _, m := range name.FindAllStringSubmatch(r.Expr, -1) {
				if !strings.Contains(string(source), strconv.Quote(m[1])) {
					t.Errorf("%s: there is no figure beamward_%s", r.Alert, m[1])
				}
			}
			for _, m := range reason.FindAllStringSubmatch(r.Expr, -1) {
				if !strings.Contains(string(codes), strconv.Quote(m[1])) {
					t.Errorf("%s: there is no reason %s", r.Alert, m[1])
				}
			}
		}
	}
	if n < 6 {
		t.Errorf("only %d alerts", n)
	}
}

// promtool, where it is installed, takes the rules.
func TestPromtool(t *testing.T) {
	tool, err := exec.LookPath("promtool")
	if err != nil {
		t.Skip("promtool is not installed (Debian package prometheus)")
	}
	if out, err := exec.Command(tool, "check", "rules", "prometheus/beamward-alerts.yml").CombinedOutput(); err != nil {
		t.Errorf("%v: %s", err, out)
	}
}

// systemd's own measure of the unit's exposure, from 0 (none) to 10.
func TestUnitExposure(t *testing.T) {
	tool, err := exec.LookPath("systemd-analyze")
	if err != nil {
		t.Skip("systemd-analyze is not installed")
	}
	unit, err := filepath.Abs("systemd/beamward.service")
	if err != nil {
		t.Fatal(err)
	}
	out, err := exec.Command(tool, "security", "--offline=true", "--threshold=100", "--no-pager", unit).CombinedOutput()
	m := regexp.MustCompile(`exposure level for [^:]*: ([0-9.]+)`).FindSubmatch(out)
	if m == nil {
		t.Skipf("systemd-analyze does not tell here: %v: %.200s", err, out)
	}
	level, _ := strconv.ParseFloat(string(m[1]), 64)
	t.Logf("exposure level %v", level)
	if !(level <= 1.5) {
		t.Errorf("exposure level %v is over 1.5", level)
	}
}
