package service

import (
	"context"
	"fmt"
	"path/filepath"

	"beamward/service/journal"
	"beamward/service/schedule"
)

// upkeep schedules what is done once a day, at the site's noon: the record's
// chain is verified, and what is older than the configuration keeps is pruned.
func (s *Service) upkeep() error {
	jobs := []schedule.Job{{Name: "verify", When: "0 12 * * *", Do: s.verifyRecord}}
	if s.cfg.Retention.KeepFacts > 0 {
		jobs = append(jobs, schedule.Job{Name: "prune", When: "30 12 * * *", Do: s.pruneRecord})
	}
	work, err := schedule.New(schedule.Options{
		Clock: s.clock, Zone: s.cfg.Zone, Jobs: jobs, State: filepath.Join(s.cfg.DataDir, "schedule.json"),
		Told: func(job string, err error) {
			if err != nil {
				s.log.Error("scheduled work went wrong", "job", job, "err", err)
				return
			}
			s.log.Info("scheduled work is done", "job", job)
		},
	})
	if err != nil {
		return err
	}
	s.parts.run("schedule", work.Run)
	return nil
}

func (s *Service) verifyRecord(ctx context.Context) error {
	report, err := s.journal.Verify(ctx, nil)
	if err != nil {
		return err
	}
	if report.Damage != nil {
		return fmt.Errorf("the record is damaged: %w", report.Damage)
	}
	return nil
}

// pruneRecord lets entries go that are older than the configuration keeps;
// their digests stay.
func (s *Service) pruneRecord(ctx context.Context) error {
	_, err := s.journal.Prune(ctx, journal.Retention{Before: s.clock.Wall().Add(-s.cfg.Retention.KeepFacts)})
	return err
}
