package schedule

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"time"

	"github.com/robfig/cron/v3"
)

// Job is one piece of work and when it is due.
type Job struct {
	Name string
	When string // five cron fields, in the site's zone
	Do   func(ctx context.Context) error
}

// Clock is what a schedule needs of the service's clock.
type Clock interface {
	Wall() time.Time
	Timer(d time.Duration) (fired <-chan struct{}, stop func() bool)
}

// Options are what a schedule is made of.
type Options struct {
	Clock Clock
	Zone  *time.Location
	Jobs  []Job
	State string                       // file that remembers the last runs; empty: none are caught up
	Told  func(name string, err error) // of each run; nil: nobody
}

// Schedule runs jobs. It is used by one goroutine.
type Schedule struct {
	opt  Options
	jobs []job
}

type job struct {
	Job
	when cron.Schedule
	due  time.Time
}

// New reads the jobs' times. It fails for one that no day has.
func New(opt Options) (*Schedule, error) {
	if opt.Clock == nil || opt.Zone == nil {
		return nil, errors.New("making the schedule: a clock and a zone are needed")
	}
	if opt.Told == nil {
		opt.Told = func(string, error) {}
	}
	s := &Schedule{opt: opt}
	last, err := s.remembered()
	if err != nil {
		opt.Told("schedule", err) // a lost memory runs everything once more
	}
	now := opt.Clock.Wall().In(opt.Zone)
	for _, j := range opt.Jobs {
		when, err := cron.ParseStandard(j.When)
		if err != nil {
			return nil, fmt.Errorf("making the schedule: job %s: %w", j.Name, err)
		}
		from := now
		if before, known := last[j.Name]; known && before.Before(now) {
			from = before.In(opt.Zone) // what was missed since is due at once
		}
		due := when.Next(from)
		if due.IsZero() {
			return nil, fmt.Errorf("making the schedule: job %s: its time never comes", j.Name)
		}
		s.jobs = append(s.jobs, job{j, when, due})
	}
	return s, nil
}

// Run runs each job when it is due, until ctx ends.
func (s *Schedule) Run(ctx context.Context) error {
	for {
		next := s.next()
		if next == nil {
			<-ctx.Done()
			return nil
		}
		// Look again every minute at the latest: the clock may be stepped.
		wait := min(max(next.due.Sub(s.opt.Clock.Wall()), 0), time.Minute)
		if wait > 0 {
			fired, stop := s.opt.Clock.Timer(wait)
			select {
			case <-ctx.Done():
				stop()
				return nil
			case <-fired:
			}
			continue
		}
		s.opt.Told(next.Name, once(ctx, next.Do))
		if ctx.Err() != nil {
			return nil
		}
		now := s.opt.Clock.Wall().In(s.opt.Zone)
		next.due = next.when.Next(now)
		if err := s.remember(next.Name, now); err != nil {
			s.opt.Told("schedule", err)
		}
	}
}

// next returns the job that is due first, or nil.
func (s *Schedule) next() *job {
	var first *job
	for i := range s.jobs {
		if first == nil || s.jobs[i].due.Before(first.due) {
			first = &s.jobs[i]
		}
	}
	return first
}

// once runs a job; a panic is its error.
func once(ctx context.Context, do func(context.Context) error) (err error) {
	defer func() {
		if p := recover(); p != nil {
			err = fmt.Errorf("panic: %v", p)
		}
	}()
	return do(ctx)
}

func (s *Schedule) remembered() (map[string]time.Time, error) {
	last := map[string]time.Time{}
	if s.opt.State == "" {
		return last, nil
	}
	text, err := os.ReadFile(s.opt.State)
	if errors.Is(err, fs.ErrNotExist) {
		return last, nil
	}
	if err == nil {
		err = json.Unmarshal(text, &last)
	}
	if err != nil {
		return map[string]time.Time{}, fmt.Errorf("reading when jobs last ran from %s: %w", s.opt.State, err)
	}
	return last, nil
}

// remember writes when a job ran, whole or not at all.
func (s *Schedule) remember(name string, at time.Time) error {
	if s.opt.State == "" {
		return nil
	}
	last, _ := s.remembered()
	last[name] = at.UTC()
	text, err := json.Marshal(last)
	if err != nil {
		return err
	}
	next, err := os.CreateTemp(filepath.Dir(s.opt.State), ".schedule-*")
	if err != nil {
		return fmt.Errorf("remembering when jobs ran: %w", err)
	}
	defer os.Remove(next.Name())
	_, err = next.Write(text)
	if err = errors.Join(err, next.Close()); err != nil {
		return fmt.Errorf("remembering when jobs ran: %w", err)
	}
	return os.Rename(next.Name(), s.opt.State)
}
