package console

import (
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

// luminance is the relative luminance of a colour #rrggbb (WCAG 2.2).
func luminance(t *testing.T, colour string) float64 {
	t.Helper()
	var sum float64
	for i, weight := range []float64{0.2126, 0.7152, 0.0722} {
		n, err := strconv.ParseUint(colour[1+2*i:3+2*i], 16, 8)
		if err != nil {
			t.Fatal(err)
		}
		v := float64(n) / 255
		if v <= 0.04045 {
			v /= 12.92
		} else {
			v = math.Pow((v+0.055)/1.055, 2.4)
		}
		sum += weight * v
	}
	return sum
}

// Text stands out by at least 4.5:1 and graphics by 3:1, in both themes, on
// each ground that they are drawn on.
func TestContrast(t *testing.T) {
	css := files(t)["console.css"]
	for theme, head := range map[string]string{"day": ":root {", "night": `:root[data-theme="night"] {`} {
		_, block, found := strings.Cut(css, head)
		if !found {
			t.Fatalf("there is no %s theme", theme)
		}
		block, _, _ = strings.Cut(block, "}")
		colours := map[string]string{}
		for _, m := range regexp.MustCompile(`--([\w-]+): (#[0-9a-f]{6});`).FindAllStringSubmatch(block, -1) {
			colours[m[1]] = m[2]
		}
		least := math.Inf(1)
		for _, c := range []struct {
			on, of string
			atMin  float64
		}{
			{"panel", "ink", 4.5}, {"ground", "ink", 4.5}, {"panel", "soft", 4.5}, {"ground", "soft", 4.5}, {"full", "on-full", 4.5},
			{"panel", "notice", 4.5}, {"ground", "notice", 4.5}, {"notice-ground", "on-notice", 4.5}, {"panel", "alarm", 4.5}, {"ground", "alarm", 4.5}, {"alarm-ground", "on-alarm", 4.5},
			{"panel", "edge", 3}, {"ground", "edge", 3}, {"panel", "focus", 3}, {"ground", "focus", 3},
		} {
			if colours[c.on] == "" || colours[c.of] == "" {
				t.Fatalf("%s: %s or %s has no colour", theme, c.on, c.of)
			}
			a, b := luminance(t, colours[c.on]), luminance(t, colours[c.of])
			got := (max(a, b) + 0.05) / (min(a, b) + 0.05)
			if c.atMin == 4.5 {
				least = min(least, got)
			}
			if !(got >= c.atMin) {
				t.Errorf("%s: %s on %s is %.2f:1, at least %.1f:1 is asked", theme, c.of, c.on, got, c.atMin)
			}
		}
		t.Logf("%s: the least of text is %.2f:1", theme, least)
	}
}
