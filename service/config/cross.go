package config

import (
	"strings"
	"time"
)

// pairs checks the keys that go together or exclude each other within one
// section.
func (b *binder) pairs(f *fileKeys) {
	both := func(x, y at) {
		if x.line > 0 != (y.line > 0) {
			if x.line == 0 {
				x, y = y, x
			}
			b.refuse(x.line, y.key, "", "it is missing: it goes with "+lastWord(x.key))
		}
	}
	both(f.Site.UT1UTC.at, f.Site.UT1UTCUntil.at)
	both(f.Site.PressureHPa.at, f.Site.TemperatureC.at)
	for i := range f.Neighbours {
		n := &f.Neighbours[i]
		key := strings.TrimSuffix(n.ID.key, ".id")
		if !b.trusted(key) {
			continue
		}
		if (n.Offset == nil) == (n.Position == nil) {
			b.refuse(b.nearest(key).line, key, "", "state one of offset and position")
			continue
		}
		if p := n.Position; p != nil {
			b.number(&p.Lat, -90, 90)
			b.number(&p.Lon, -180, 360)
			b.number(&p.Height, -500, 9000)
		}
	}
	if f.Retention.KeepFacts.has && !(f.Retention.KeepFacts.value >= 48*time.Hour) {
		b.at(f.Retention.KeepFacts.at, "make it at least 2d, so that a night can be explained")
	}
}

// number refuses a number outside its bounds.
func (b *binder) number(x *number, least, most float64) {
	if x.has && !(x.value >= least && x.value <= most) {
		l, m := number{value: least}, number{value: most}
		b.at(x.at, "make it "+l.write()+" to "+m.write())
	}
}

// at refuses a value that was read.
func (b *binder) at(a at, mend string) {
	b.refuse(b.nearest(a.key).line, a.key, shown(a.text), mend)
}

func lastWord(key string) string { return key[strings.LastIndexByte(key, '.')+1:] }

// access checks who can sign in: that every certificate stands for one person
// and that a second person can exist where one is asked for.
func (b *binder) access(f *fileKeys) {
	if f.TLS != nil && f.TLS.Cert.has && f.TLS.Cert.value == f.TLS.Key.value {
		b.at(f.TLS.Key.at, "name another file than cert_file")
	}
	if f.Access == nil {
		b.secondPersons(f, false)
		return
	}
	a := f.Access
	if !a.Tokens.has && len(a.Certificates) == 0 && b.trusted("access") {
		b.refuse(b.where["access"].line, "access", "", "state tokens_file or certificates, or take the section out")
	}
	if len(a.Certificates) > 0 && (f.TLS == nil || !f.TLS.ClientCA.has) && b.trusted("tls") {
		b.refuse(b.where["access.certificates"].line, "access.certificates", "", "add tls.client_ca_file: nothing else vouches for a client certificate")
	}
	names, matches := map[string]bool{}, map[string]bool{}
	for i := range a.Certificates {
		c := &a.Certificates[i]
		key := strings.TrimSuffix(c.Name.key, ".name")
		if !b.trusted("access") {
			break
		}
		if folded := strings.ToLower(c.Name.value); names[folded] {
			b.at(c.Name.at, "choose another name: another certificate has it")
		} else {
			names[folded] = true
		}
		var match []at
		for _, m := range []at{c.CommonName.at, c.DNS.at, c.Email.at, c.URI.at} {
			if m.has {
				match = append(match, m)
			}
		}
		if len(match) != 1 {
			b.refuse(b.nearest(key).line, key, "", "state exactly one of common_name, dns, email and uri")
			continue
		}
		if id := lastWord(match[0].key) + "=" + match[0].text; matches[id] {
			b.at(match[0], "another name has this certificate already")
		} else {
			matches[id] = true
		}
		switch {
		case c.Role.value == "feed" && len(c.Sources) == 0:
			b.refuse(b.nearest(key).line, join(key, "sources"), "", "name what it may speak for")
		case c.Role.value == "read" && len(c.Sources) > 0:
			b.refuse(b.nearest(key).line, join(key, "sources"), "", "take it out: the role read speaks for nothing")
		}
		b.known(f, c.Sources)
	}
	b.secondPersons(f, a.Tokens.has || len(a.Certificates) > 1)
}

// secondPersons refuses an authority whose loosening lists could never be
// confirmed, so that the beam would wait for a person who cannot exist.
func (b *binder) secondPersons(f *fileKeys, possible bool) {
	for i := range f.Authorities {
		l := &f.Authorities[i].Loosening
		if !possible && l.value == "second-person" && b.trusted("access", l.key) {
			b.at(l.at, "nobody signs in by name: add access.tokens_file, or make it confirm or at-once")
		}
	}
}

// known checks that names denote something that can speak.
func (b *binder) known(f *fileKeys, names []text) {
	if !b.trusted("sources", "beams", "neighbours", "watches") {
		return
	}
	for _, n := range names {
		if n.has && b.kind(f, n.value) == "" {
			b.at(n.at, "name a source, beam, neighbour or post that the file describes")
		}
	}
}

// kind says what a name denotes: a source's kind, or beam, neighbour, post;
// empty: nothing that can speak.
func (b *binder) kind(f *fileKeys, name string) string {
	for i := range f.Sources {
		if f.Sources[i].ID.value == name {
			return f.Sources[i].Kind.value
		}
	}
	for i := range f.Beams {
		if f.Beams[i].ID.value == name {
			return "beam"
		}
	}
	for i := range f.Neighbours {
		if f.Neighbours[i].ID.value == name {
			return "neighbour"
		}
	}
	for i := range f.Watches {
		if f.Watches[i].Post.value == name {
			return "post"
		}
	}
	return ""
}

// lists checks what an authority's texts are read by.
func (b *binder) lists(f *fileKeys) {
	for i := range f.Authorities {
		l := &f.Authorities[i].Layout
		if _, ok := f.Layouts[l.value]; l.has && !ok && b.trusted("layouts") {
			b.at(l.at, "name an entry of layouts, or leave it out for native lists")
		}
	}
}
