package main

import (
	"bytes"
	"fmt"
	"os"

	"beamward/closures"
	"beamward/geometry/sky"
	"beamward/geometry/span"
	"beamward/service/config"
	"beamward/service/render"
)

// chartOf begins the drawing of a plan: the night without its targets.
func chartOf(cfg *config.Config, beam closures.BeamID, over span.Span, nights []*sky.Night) render.Chart {
	return render.Chart{
		Title: fmt.Sprintf("%s, beam %s", cfg.Rules.Site.Name, beam), Over: over, Zone: cfg.Zone, Sun: render.Twilight(nights, over),
		Notes: []string{"Planned offline, on lists as if each were confirmed; holds are not known."},
	}
}

// drawChart writes a chart, whole or not at all.
func drawChart(path string, c *render.Chart) error {
	var svg bytes.Buffer
	if err := c.SVG(&svg); err != nil {
		return fmt.Errorf("drawing the plan: %w", err)
	}
	if err := os.WriteFile(path, svg.Bytes(), 0o644); err != nil {
		return fmt.Errorf("drawing the plan: %w: name a file that can be written", err)
	}
	return nil
}
