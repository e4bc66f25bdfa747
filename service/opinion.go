package service

import (
	"context"

	"beamward/closures/recheck"
	"beamward/service/engine"
)

// secondOpinion looks at every published view apart from the engine, and
// vetoes an open beam that contradicts what is known. It can only shutter.
func (s *Service) secondOpinion(ctx context.Context) error {
	for ctx.Err() == nil && !s.engine.View().Stopped {
		updates, cancel := s.engine.Watch(watchBuffer)
		s.recheck(ctx, updates)
		cancel()
	}
	return nil
}

func (s *Service) recheck(ctx context.Context, updates <-chan engine.Update) {
	var c recheck.Checker
	for {
		select {
		case <-ctx.Done():
			return
		case u, more := <-updates:
			if !more {
				return
			}
			v := u.View
			for i := range v.Beams {
				d := v.Beams[i].Decision
				// What is known is copied at most ten times a second. A view between
				// two copies cannot be judged; the next one is.
				if !d.Open || v.Known == nil || !v.Known.At.Equal(d.At) {
					continue
				}
				veto, against := c.Check(d, v.Known, v.Foreseen, v.Rules, d.At)
				if !against {
					continue
				}
				s.log.Error("the second opinion vetoes an open beam", "beam", d.Beam, "decision", d.Seq, "why", veto.Detail)
				if _, err := s.engine.Offer("second-opinion", veto); err != nil {
					s.log.Error("the veto was not taken in", "err", err)
				}
			}
		}
	}
}
