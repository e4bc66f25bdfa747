package demo

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/geometry/span"
)

// lists are the closure lists of the night, by what the story calls them.
func lists(start time.Time, stars map[string]r3.Vector) map[string]*closures.ListText {
	night := span.Span{From: start.Truncate(time.Hour).Add(-12 * time.Hour), Until: start.Truncate(time.Hour).Add(24 * time.Hour)}
	issued := night.From.Add(-3 * time.Hour)
	closed := func(from, until time.Duration, region int32, ref string) closures.Window {
		return closures.Window{Region: region, From: start.Add(from).UnixNano(), Until: start.Add(until).UnixNano(), Ref: ref}
	}
	cone := func(id string, radius s1.Angle) closures.Region {
		return closures.Region{ID: id, Shape: closures.ICRSCone, Direction: stars[id], Radius: radius}
	}
	return map[string]*closures.ListText{
		// The desk names the fields that it was asked about; one of them is
		// crossed by a satellite while the story lasts.
		"tonight": {
			ID: "2031-045-B", Authority: "orbital-desk", Issued: issued, Covers: night, UnlistedOpen: true,
			Regions: []closures.Region{cone("f-101", s1.Degree/20), cone("f-102", s1.Degree/20), cone("r-7", s1.Degree/20)},
			Windows: []closures.Window{
				closed(20*second, 22*second, 1, "A-17"),
				closed(-4*time.Hour, -4*time.Hour+39*second, 0, "A-12"),
				closed(-2*time.Hour, -2*time.Hour+21*second, 2, "A-14"),
			},
		},
		"survey": {
			ID: "S-7", Authority: "survey-office", Issued: issued, Covers: night, UnlistedOpen: true,
			Regions: []closures.Region{{ID: "q-1", Shape: closures.ICRSCone, Direction: stars["q-1"], Radius: 2 * s1.Degree, Throughout: closures.ThroughoutClosed}},
		},
	}
}

// bringList puts a list of the orbital desk into its folder, as another
// program would: written beside it and renamed into it. Any other list goes
// over the API.
func (s *stage) bringList(ctx context.Context, name string) error {
	t := s.lists[name]
	if t == nil {
		return fmt.Errorf("the story brings list %q, which is not written", name)
	}
	var text bytes.Buffer
	if t.Authority != "orbital-desk" {
		if err := listfile.WriteCSV(&text, t); err != nil {
			return err
		}
		return s.during(ctx, func() error {
			_, err := s.api.AddList(ctx, &text, "csv", "")
			return err
		})
	}
	if err := listfile.WriteYAML(&text, t); err != nil {
		return err
	}
	folder := filepath.Join(s.dir, "lists")
	beside := filepath.Join(s.dir, string(t.ID)+".yaml")
	if err := os.WriteFile(beside, text.Bytes(), 0o600); err != nil {
		return err
	}
	if err := os.Rename(beside, filepath.Join(folder, filepath.Base(beside))); err != nil {
		return err
	}
	return s.untilList(ctx, t)
}

// confirmList confirms a list as it stands with the service.
func (s *stage) confirmList(ctx context.Context, name string) error {
	t := s.lists[name]
	e := s.service.Engine().View().Book.Find(t.Authority, t.ID)
	if e == nil {
		return fmt.Errorf("confirming list %s: the service does not have it", t.ID)
	}
	return s.during(ctx, func() error {
		_, err := s.api.ConfirmList(ctx, t.Authority, t.ID, e.List.Digest().String())
		return err
	})
}
