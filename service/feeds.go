package service

import (
	"bytes"
	"context"
	"crypto/tls"
	"fmt"
	"io"
	"math/rand/v2"
	"net/netip"
	"os"

	"beamward/closures"
	"beamward/closures/listfile"
	"beamward/geometry/encounter"
	"beamward/service/access"
	"beamward/service/config"
	"beamward/service/feed"
	"beamward/service/feed/asterix"
	"beamward/service/feed/modes"
)

// bindFeeds makes the ways in for facts and the watched folders of lists.
func (s *Service) bindFeeds(guard *access.Guard, secure *tls.Config) error {
	for i := range s.cfg.Feeds {
		address, err := s.bindFeed(&s.cfg.Feeds[i], guard, secure)
		if err != nil {
			return err
		}
		s.parts.addresses.Feeds = append(s.parts.addresses.Feeds, address)
	}
	return s.bindFolders()
}

// bindFeed makes one feed; what has no receiver here stops the start rather
// than be left out in silence.
func (s *Service) bindFeed(f *config.Feed, guard *access.Guard, secure *tls.Config) (address string, err error) {
	o := feed.Options{
		Intake: func(from closures.Source, body closures.Body) error {
			_, err := s.engine.Offer(from, body)
			return err
		},
		Clock: s.clock,
		Notice: func(text string, args ...any) {
			s.log.Warn(text, append([]any{"feed", f.Kind}, args...)...)
		},
	}
	for _, name := range f.Sources {
		src := s.cfg.Rules.Source(name)
		o.Bound = append(o.Bound, feed.Bound{Name: name, Aircraft: src != nil && src.Kind == closures.AircraftSource})
	}
	switch f.Kind {
	case config.FactsTCP:
		t, err := feed.ListenTCP(feed.TCPOptions{Options: o, Listen: f.Listen, Admits: admission(f.Admits), Access: speakers{guard}, TLS: secure})
		if err != nil {
			return "", err
		}
		s.parts.closing = append(s.parts.closing, t.Close)
		s.parts.run("feed "+f.Kind+" at "+t.Addr().String(), t.Run)
		return t.Addr().String(), nil
	case config.FactsUDP:
		u, err := feed.ListenUDP(feed.UDPOptions{Options: o, Listen: f.Listen})
		if err != nil {
			return "", err
		}
		s.parts.closing = append(s.parts.closing, u.Close)
		s.parts.run("feed "+f.Kind+" at "+u.Addr().String(), u.Run)
		return u.Addr().String(), nil
	case config.FactsFile:
		t, err := feed.FollowFile(feed.FileOptions{Options: o, Path: f.File})
		if err != nil {
			return "", err
		}
		s.parts.run("feed "+f.Kind+" "+f.File, t.Run)
		return "", nil
	case config.ModeS:
		m, err := feed.NewModeS(feed.ModeSOptions{
			Intake: o.Intake, Clock: o.Clock, Notice: o.Notice, Dial: f.Dial, File: f.File, Jitter: rand.Float64,
			Decoder: s.decoder(f.Sources[0]),
		})
		if err != nil {
			return "", err
		}
		s.parts.run("feed "+f.Kind+" "+f.Dial+f.File, m.Run)
		return "", nil
	case config.Asterix021:
		d := s.decoder(f.Sources[0])
		a, err := feed.ListenAsterix(feed.AsterixOptions{
			Intake: o.Intake, Clock: o.Clock, Notice: o.Notice, Listen: f.Listen,
			Decoder: asterix.Options{
				Source: d.Source, Edition: f.Edition, Geoid: d.Geoid, Motion: d.Motion,
				PositionError: d.PositionError, VelocityError: d.VelocityError, ClimbError: d.ClimbError,
			},
		})
		if err != nil {
			return "", err
		}
		s.parts.closing = append(s.parts.closing, a.Close)
		s.parts.run("feed "+f.Kind+" at "+a.Addr().String(), a.Run)
		return a.Addr().String(), nil
	}
	return "", fmt.Errorf("feeds: kind %s is not received by this build: take it out", f.Kind)
}

// decoder is how Mode S frames of a source are read: by the site's place and
// the bounds of the rules.
func (s *Service) decoder(source closures.Source) modes.Options {
	r := s.cfg.Rules
	o := modes.Options{
		Source: source, Site: r.Site.Position, Geoid: r.Site.Geoid,
		Motion: encounter.Motion{HorizontalAcceleration: r.Aircraft.HorizontalAccel, VerticalAcceleration: r.Aircraft.VerticalAccel, Speed: r.Aircraft.SpeedMax, Climb: r.Aircraft.ClimbMax},
	}
	if src := r.Source(source); src != nil {
		o.PositionError, o.VelocityError, o.ClimbError = src.PositionError, src.VelocityError, src.VerticalVelocityErr
	}
	return o
}

func admission(s string) feed.Admission {
	switch s {
	case config.AdmitAnyone:
		return feed.AdmitAnyone
	case config.AdmitToken:
		return feed.AdmitToken
	}
	return feed.AdmitCertificate
}

// speakers is the guard as feeds see it.
type speakers struct{ *access.Guard }

// speaker is one person as feeds see it.
type speaker struct {
	access.Person
	guard *access.Guard
}

func (p speaker) Still() bool { return p.guard.Still(p.Person) }

func (g speakers) Token(from netip.Addr, token string) (feed.Speaker, error) {
	p, err := g.Guard.Token(from, token)
	if err != nil {
		return nil, err
	}
	return speaker{p, g.Guard}, nil
}

func (g speakers) Certificate(from netip.Addr, state tls.ConnectionState) (feed.Speaker, error) {
	p, err := g.Guard.Connection(from, state)
	if err != nil {
		return nil, err
	}
	return speaker{p, g.Guard}, nil
}

// bindFolders watches the authorities' folders.
func (s *Service) bindFolders() error {
	var all []feed.FolderOptions
	for _, f := range s.cfg.Folders {
		read, err := s.reader(f.Layout)
		if err != nil {
			return err
		}
		all = append(all, feed.FolderOptions{
			Authority: f.Authority, Path: f.Path, Clock: s.clock,
			Offer: func(ctx context.Context, a closures.AuthorityID, name string, text io.Reader) error {
				return s.offerList(ctx, a, name, text, read)
			},
			Notice: func(text string, args ...any) { s.log.Warn(text, args...) },
		})
	}
	folders, err := feed.WatchFolders(all)
	if err != nil {
		return err
	}
	for i, f := range folders {
		s.parts.run("folder of "+string(all[i].Authority), f.Run)
	}
	return nil
}

// listReader reads one list's text.
type listReader func(name string, text io.Reader) (*closures.List, error)

// reader returns what reads an authority's texts: its layout, or the native
// formats.
func (s *Service) reader(layout string) (listReader, error) {
	if layout == "" {
		return func(name string, text io.Reader) (*closures.List, error) {
			l, _, err := listfile.Load(text, listfile.FormatOf(name), listfile.Limits{})
			return l, err
		}, nil
	}
	compiled, err := s.layout(layout)
	if err != nil {
		return nil, err
	}
	return func(_ string, text io.Reader) (*closures.List, error) {
		l, _, err := compiled.Load(text, listfile.Limits{})
		return l, err
	}, nil
}

// layout compiles one of the configuration's layouts.
func (s *Service) layout(name string) (*listfile.Layout, error) {
	text, err := os.ReadFile(s.cfg.Layouts[name])
	if err != nil {
		return nil, fmt.Errorf("reading layout %s: %w", name, err)
	}
	compiled, err := listfile.CompileLayout(text)
	if err != nil {
		return nil, fmt.Errorf("reading layout %s: %w", name, err)
	}
	return compiled, nil
}

// layouts compiles all of them.
func (s *Service) layouts() (map[string]*listfile.Layout, error) {
	out := map[string]*listfile.Layout{}
	for name := range s.cfg.Layouts {
		l, err := s.layout(name)
		if err != nil {
			return nil, err
		}
		out[name] = l
	}
	return out, nil
}

// offerList reads a list of an authority and gives it to the engine. The same
// text again does no harm.
func (s *Service) offerList(ctx context.Context, a closures.AuthorityID, name string, text io.Reader, read listReader) error {
	// The whole is read before it is looked at: its end comes only if the file
	// did not change meanwhile.
	whole, err := io.ReadAll(text)
	if err != nil {
		return closures.Errorf(closures.Internal, "it is tried again", "list %.80q: it cannot be read", name)
	}
	l, err := read(name, bytes.NewReader(whole))
	if err != nil {
		return err
	}
	if l.Authority() != a {
		return closures.Errorf(closures.Invalid, "put it into that authority's folder", "list %s: it lies in the folder of %s", l, a)
	}
	// Asked first, so that a list that is there already is not told anew, and
	// one that can never be taken does not trouble the engine.
	v := s.engine.View()
	if same, _, err := v.Book.Offer(v.Rules, l); err != nil || same {
		return err
	}
	_, err = s.submit(ctx, closures.Source("folder:"+string(a)), closures.ListOffered{List: l, By: "folder:" + string(a)})
	return err
}
