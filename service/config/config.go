package config

import (
	"crypto/sha256"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"reflect"
	"time"

	"beamward/closures"
)

// Config is one file, understood whole. It is immutable. Paths are absolute
// where the folder given to Parse is; those inside Rules are as written, so
// that rules do not depend on where they are installed.
type Config struct {
	Rules        *closures.Rules
	Zone         *time.Location // the site's
	DataDir      string
	Listen       string // address of the API and the console
	PermitListen string // address of the permit listener
	TLS          TLS
	Access       Access
	Feeds        []Feed
	Folders      []Folder
	Layouts      map[string]string // path by name
	Retention    Retention
	Text         []byte // as it was read

	canonical []byte
}

// TLS names the files of this service's certificate. All empty: no TLS.
type TLS struct {
	CertFile, KeyFile string
	ClientCAFile      string // empty: no client certificate is asked for
}

// On reports whether listeners use TLS.
func (t TLS) On() bool { return t.CertFile != "" }

// Access says who can sign in. The zero value is nobody by name: the loopback
// interface only.
type Access struct {
	TokensFile   string // empty: no tokens
	Certificates []Certificate
}

// Named reports whether people and machines sign in by name.
func (a Access) Named() bool { return a.TokensFile != "" || len(a.Certificates) > 0 }

// Certificate says whom a client certificate stands for. Exactly one of
// CommonName, DNS, Email and URI is set.
type Certificate struct {
	Name                        string
	Role                        string // read, feed, operate or admin
	Sources                     []closures.Source
	CommonName, DNS, Email, URI string
}

// The kinds of feeds.
const (
	FactsTCP   = "facts-tcp"
	FactsUDP   = "facts-udp"
	FactsFile  = "facts-file"
	ModeS      = "mode-s"
	Asterix021 = "asterix-021"
)

// What a connection to a feed must show.
const (
	AdmitAnyone      = "anyone" // on the loopback interface only
	AdmitToken       = "token"
	AdmitCertificate = "certificate"
)

// Feed is one way for facts to come in. Exactly one of Listen, Dial and File
// is set.
type Feed struct {
	Kind    string
	Listen  string
	Dial    string
	File    string
	Admits  string            // of facts-tcp
	Sources []closures.Source // what it may speak for: sources, beams, neighbours, posts; never none
	Edition string            // of asterix-021
}

// Folder is where an authority's lists are put.
type Folder struct {
	Authority closures.AuthorityID
	Path      string
	Layout    string // name in Layouts; empty: native
}

// Retention says how long the record keeps what.
type Retention struct {
	KeepFacts time.Duration
}

// Canonical returns the canonical text, of which Rules.Digest is the SHA-256.
// The caller does not change it.
func (c *Config) Canonical() []byte { return c.canonical }

// Load reads the file at path. Its problems are an *Error.
func Load(path string) (*Config, error) {
	dir, err := filepath.Abs(filepath.Dir(path))
	if err != nil {
		return nil, fmt.Errorf("find the folder of config %s: %w", path, err)
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("read config: %w: name the file with --config", err)
	}
	defer f.Close()
	text, err := io.ReadAll(io.LimitReader(f, MaxText+1))
	if err != nil {
		return nil, fmt.Errorf("read config %s: %w", path, err)
	}
	c, err := Parse(text, dir)
	if e, ok := err.(*Error); ok {
		e.File = path
	}
	return c, err
}

// Parse understands a text whose relative paths start in dir. Its problems are
// an *Error with all of them; there is no Config then.
func Parse(text []byte, dir string) (*Config, error) {
	top, problems := tree(text)
	if top == nil {
		return nil, &Error{Problems: problems}
	}
	b := &binder{problems: problems, where: map[string]at{}, spoiled: map[string]bool{}}
	var f fileKeys
	b.mapping(reflect.ValueOf(&f).Elem(), top, "")
	b.pairs(&f)
	r := b.rules(&f)
	b.validate(r)
	b.access(&f)
	b.feeds(&f)
	b.listeners(&f)
	b.lists(&f)
	if len(b.problems) > 0 {
		return nil, &Error{Problems: ordered(b.problems)}
	}
	c := b.config(&f, dir)
	c.Text = append([]byte(nil), text...)
	c.canonical = canonical(&f)
	r.Digest = sha256.Sum256(c.canonical)
	c.Rules = r
	return c, nil
}

func (b *binder) config(f *fileKeys, dir string) *Config {
	path := func(s string) string {
		if s == "" || filepath.IsAbs(s) {
			return s
		}
		return filepath.Join(dir, s)
	}
	zone, err := time.LoadLocation(f.Site.TimeZone.value)
	if err != nil { // the form was checked: the database changed meanwhile
		zone = time.UTC
	}
	c := &Config{
		Zone: zone, DataDir: path(f.DataDir.value), Listen: f.Listen.value, PermitListen: f.Permit.Listen.value,
		Layouts: map[string]string{}, Retention: Retention{KeepFacts: f.Retention.KeepFacts.value},
	}
	if t := f.TLS; t != nil {
		c.TLS = TLS{CertFile: path(t.Cert.value), KeyFile: path(t.Key.value), ClientCAFile: path(t.ClientCA.value)}
	}
	if a := f.Access; a != nil {
		c.Access.TokensFile = path(a.Tokens.value)
		for i := range a.Certificates {
			k := &a.Certificates[i]
			c.Access.Certificates = append(c.Access.Certificates, Certificate{
				Name: k.Name.value, Role: k.Role.value, Sources: sources(k.Sources),
				CommonName: k.CommonName.value, DNS: k.DNS.value, Email: k.Email.value, URI: k.URI.value,
			})
		}
	}
	for i := range f.Feeds {
		k := &f.Feeds[i]
		c.Feeds = append(c.Feeds, Feed{
			Kind: k.Kind.value, Listen: k.Listen.value, Dial: k.Dial.value, File: path(k.File.value),
			Admits: k.Admits.value, Sources: k.speaksFor(), Edition: k.Edition.value,
		})
	}
	for i := range f.Authorities {
		if a := &f.Authorities[i]; a.Folder.has {
			c.Folders = append(c.Folders, Folder{Authority: closures.AuthorityID(a.ID.value), Path: path(a.Folder.value), Layout: a.Layout.value})
		}
	}
	for name, p := range f.Layouts {
		c.Layouts[name] = path(p.value)
	}
	return c
}

func sources(names []text) []closures.Source {
	var out []closures.Source
	for _, n := range names {
		out = append(out, closures.Source(n.value))
	}
	return out
}

// speaksFor gives the names that the feed is bound to.
func (k *feedKeys) speaksFor() []closures.Source {
	if k.Source.has {
		return []closures.Source{closures.Source(k.Source.value)}
	}
	return sources(k.Sources)
}
