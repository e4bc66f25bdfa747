package service

import (
	"context"
	"fmt"
	"reflect"
	"strings"

	"beamward/closures"
	"beamward/service/config"
)

// Reload puts the rules of another configuration in force. Everything that can
// fail is done before anything live is touched. What was bound at the start
// (addresses, feeds, folders, access) takes a restart, and so does whatever
// loosens: a start is shuttered until everything has been heard afresh, and
// asks for a person. by is who asks.
func (s *Service) Reload(ctx context.Context, next *config.Config, by string) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	if next == nil {
		return closures.Errorf(closures.Invalid, "give one", "reloading: there is no configuration")
	}
	if fixed := bound(s.cfg, next); len(fixed) > 0 {
		return closures.Errorf(closures.Conflict, "restart the service to change it", "reloading: %s differs", strings.Join(fixed, ", "))
	}
	now := s.engine.View().Rules
	if now.Digest == next.Rules.Digest {
		return nil
	}
	if keys := now.Loosened(next.Rules); len(keys) > 0 {
		return closures.Errorf(closures.Conflict, "restart the service, which a person re-arms, or put these keys back", "reloading: it would loosen %s", strings.Join(keys, ", "))
	}
	if err := s.journal.PutList(next.Rules.Digest.String(), next.Canonical()); err != nil {
		return fmt.Errorf("reloading: recording the configuration: %w", err)
	}
	if _, err := s.engine.SubmitDurable(ctx, closures.Source(by), closures.RulesSet{Rules: next.Rules, By: by}); err != nil {
		return err
	}
	s.cfg = next
	s.log.Info("another configuration is in force", "rules", next.Rules.Digest.String(), "by", by)
	return nil
}

// bound names the sections that differ and were used up at the start.
func bound(old, next *config.Config) []string {
	var out []string
	for _, c := range []struct {
		name string
		a, b any
	}{
		{"data_dir", old.DataDir, next.DataDir}, {"listen", old.Listen, next.Listen}, {"permit.listen", old.PermitListen, next.PermitListen},
		{"tls", old.TLS, next.TLS}, {"access", old.Access, next.Access}, {"feeds", old.Feeds, next.Feeds}, {"authorities' folders", old.Folders, next.Folders},
		{"layouts", old.Layouts, next.Layouts}, {"retention", old.Retention, next.Retention}, {"site.time_zone", old.Rules.Site.TimeZone, next.Rules.Site.TimeZone},
	} {
		if !reflect.DeepEqual(c.a, c.b) {
			out = append(out, c.name)
		}
	}
	return out
}
