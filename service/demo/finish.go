package demo

import (
	"context"
	"errors"
	"fmt"
	"path/filepath"
	"strings"
	"time"

	"beamward/service"
	"beamward/service/engine"
	"beamward/service/journal"
)

// begin tells where everything is.
func (t *teller) begin(start time.Time, at service.Addresses, dir string) {
	if t.json {
		t.line(struct {
			Site   string    `json:"site"`
			Start  time.Time `json:"start"`
			API    string    `json:"api"`
			Permit string    `json:"permit"`
			Dir    string    `json:"dir"`
		}{"Skerry Peak", start, "http://" + at.API, "http://" + at.Permit, dir})
		return
	}
	t.printf("beamward demo: the end of a night at Skerry Peak, an invented observatory.\n")
	t.printf("It begins at %s. The times below count from then, in minutes and seconds.\n", start.Format(time.RFC3339))
	t.printf("API http://%s, permits http://%s, files in %s\n", at.API, at.Permit, dir)
	t.printf("Every permit says simulated: nothing here can open a real shutter.\n")
}

// drain tells all that was published since the last time.
func (t *teller) drain(s *stage, updates <-chan engine.Update) {
	for {
		select {
		case u, more := <-updates:
			if !more {
				return
			}
			if u.View.Started {
				t.update(u.View.Boot-s.began, u)
			}
		default:
			return
		}
	}
}

// finish verifies what is left and sums up.
func (t *teller) finish(ctx context.Context, s *stage, o Options) error {
	r, err := journal.OpenReader(filepath.Join(s.dir, "var"))
	if err != nil {
		return err
	}
	rep, err := r.Verify(ctx, nil)
	if err = errors.Join(err, r.Close()); err != nil {
		return err
	}
	missing := t.missing()
	read := 0
	for i := range s.devices.lasers {
		read += s.devices.lasers[i].reads
	}
	verify := "beamward record verify --config " + filepath.Join(s.dir, configFile)
	if t.json {
		t.line(struct {
			Missing  []string `json:"missing"`
			Permits  int      `json:"permits_read"`
			Openings int      `json:"openings"`
			Verifies bool     `json:"verifies"`
			Entries  uint64   `json:"entries"`
			Head     string   `json:"head"`
			Verify   string   `json:"verify"`
		}{missing, read, t.opens, rep.Damage == nil, rep.Entries, rep.Head.String(), verify})
	} else {
		t.table()
		t.printf("\n%d permits were read, each signed, for its request, and simulated. Beams were opened %d times.\n", read, t.opens)
		if rep.Damage == nil {
			t.printf("The record verifies: %d entries in %d blocks, head %s.\n", rep.Entries, rep.Blocks, rep.Head)
		}
		t.printf("It is left for you to look at:\n  %s\n", verify)
	}
	switch {
	case t.err != nil:
		return t.err
	case rep.Damage != nil:
		return rep.Damage
	case len(missing) > 0:
		return fmt.Errorf("the demo did not show %s: play all %v of the story", strings.Join(missing, ", "), Length)
	}
	return nil
}
