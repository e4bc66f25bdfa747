package main

import (
	"time"

	"beamward/closures"
	"beamward/closures/listfile"
)

// listSummary is what was understood of a list, as JSON has it.
type listSummary struct {
	ID          closures.ListID      `json:"id"`
	Authority   closures.AuthorityID `json:"authority"`
	Issued      time.Time            `json:"issued"`
	Covers      spanJSON             `json:"covers"`
	Replaces    []closures.ListID    `json:"replaces,omitempty"`
	Beams       []closures.BeamID    `json:"beams,omitempty"`
	UnlistedSky string               `json:"unlisted_sky"`
	Windows     int                  `json:"windows"`
	Digest      string               `json:"digest"`
	Counted     bool                 `json:"window_count_proved"`
	Summed      bool                 `json:"digest_proved"`
	Regions     []regionSummary      `json:"regions"`
}

type regionSummary struct {
	ID         string  `json:"id"`
	Shape      string  `json:"shape"`
	Throughout string  `json:"throughout,omitempty"`
	Windows    int     `json:"windows"`
	ClosedS    float64 `json:"closed_s"`
}

type spanJSON struct {
	From  time.Time `json:"from"`
	Until time.Time `json:"until"`
}

func summaryOf(s *listfile.Summary) *listSummary {
	out := &listSummary{
		ID: s.ID, Authority: s.Authority, Issued: s.Issued, Covers: spanJSON{s.Covers.From, s.Covers.Until}, Replaces: s.Replaces, Beams: s.Beams,
		UnlistedSky: "closed", Windows: s.Windows, Digest: s.Digest.String(), Counted: s.Proof.Count, Summed: s.Proof.Digest,
	}
	if s.UnlistedOpen {
		out.UnlistedSky = "open"
	}
	for _, r := range s.Regions {
		one := regionSummary{ID: r.ID, Shape: r.Shape.String(), Windows: r.Windows, ClosedS: r.Closed.Seconds()}
		switch r.Throughout {
		case closures.ThroughoutClosed:
			one.Throughout = "closed"
		case closures.ThroughoutOpen:
			one.Throughout = "open"
		}
		out.Regions = append(out.Regions, one)
	}
	return out
}
