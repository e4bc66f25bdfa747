package service

import (
	"context"
	"net/http"
	"time"

	"beamward/closures"
	"beamward/service/engine"
	"beamward/service/metrics"
	"beamward/service/permit"
)

// metrics makes what Prometheus reads, and keeps count of the time in each
// state.
func (s *Service) metrics(issuer *permit.Issuer) http.Handler {
	m := metrics.New(metrics.Options{Build: s.opt.Build, Read: func() metrics.Figures { return s.figures(issuer) }})
	s.parts.run("metrics", func(ctx context.Context) error {
		for ctx.Err() == nil {
			updates, cancel := s.engine.Watch(watchBuffer)
			s.countStates(ctx, m, updates)
			cancel()
			if s.engine.View().Stopped {
				return nil
			}
		}
		return nil
	})
	return m
}

// watchBuffer is how many updates one of the service's own watchers may leave
// unread.
const watchBuffer = 64

func (s *Service) countStates(ctx context.Context, m *metrics.Metrics, updates <-chan engine.Update) {
	for {
		select {
		case <-ctx.Done():
			return
		case u, more := <-updates:
			if !more {
				return
			}
			m.Seen(u.View.Boot, beamFigures(u.View))
		}
	}
}

func beamFigures(v *engine.View) []metrics.Beam {
	out := make([]metrics.Beam, len(v.Beams))
	for i := range v.Beams {
		d := v.Beams[i].Decision
		out[i] = metrics.Beam{ID: string(d.Beam), Open: d.Open, Reasons: d.Codes.Names()}
	}
	return out
}

// figures reads everything at one scrape.
func (s *Service) figures(issuer *permit.Issuer) metrics.Figures {
	v, stats, record := s.engine.View(), s.engine.Stats(), s.journal.State()
	wall, boot := s.clock.Read()
	f := metrics.Figures{
		Beams: beamFigures(v), Lists: map[string]int{}, Decide: metrics.Histogram(stats.Decide), Lag: metrics.Histogram(stats.Lag),
		ViewAge: boot - v.Boot, RecordBehind: record.Behind, RecordDurable: record.Durable, RecordHealthy: record.Sound && !s.record.cut,
		RecordLost: stats.Lost, Permits: issuer.Signed(), Turns: stats.Batches, Panics: stats.Panics, CutOff: stats.CutOff,
		Ready: v.Started && !v.Stopped && issuer.Fresh(),
	}
	for _, e := range v.Book {
		f.Lists[e.Status.String()]++
	}
	for _, k := range stats.Kinds {
		f.Facts = append(f.Facts, metrics.Facts{Kind: k.Kind, Accepted: k.Accepted, Superseded: k.Superseded, Refused: k.Refused})
	}
	if v.Known != nil {
		f.Aircraft = len(v.Known.Aircraft)
		for i := range v.Known.Sources {
			f.Sources = append(f.Sources, sourceFigure(&v.Known.Sources[i], wall))
		}
	}
	return f
}

func sourceFigure(k *closures.SourceKnown, now time.Time) metrics.Source {
	return metrics.Source{ID: string(k.Source), Required: k.Required, Heard: !k.Heard.IsZero(), Silent: k.Silent, Age: max(now.Sub(k.Said), now.Sub(k.Heard), 0)}
}
