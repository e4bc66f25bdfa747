package access

import (
	"context"
	"crypto/sha256"
	"slices"
	"strings"
	"time"

	"beamward/closures"
)

// LocalName is the name on record of whoever uses the loopback interface of a
// service without tokens and certificates.
const LocalName = "local"

// Person is who is asking: a person, or a machine that has a name of its own.
// The zero value is nobody.
type Person struct {
	Name    string
	Role    Role
	Sources []closures.Source // what they may speak for: sources, beams, neighbours, posts
	Token   bool              // signed in by name, with a token or a client certificate

	anySource bool              // the nameless operator speaks for all
	proof     [sha256.Size]byte // digest of the token or certificate
	until     time.Time         // end of the certificate; zero: none
}

// May reports whether they may do a. To tell facts is a matter of the source,
// too: see MaySpeakFor.
func (p Person) May(a Action) bool { return p.Name != "" && p.Role.May(a) }

// MaySpeakFor reports whether they may tell facts of the source, beam,
// neighbour or post.
func (p Person) MaySpeakFor(s closures.Source) bool {
	return p.May(Tell) && s != "" && (p.anySource || slices.Contains(p.Sources, s))
}

// SecondPerson reports whether b can confirm what a did: both signed in by
// name, and the names are two. Names that differ only in case are one.
func SecondPerson(a, b Person) bool {
	return a.Token && b.Token && a.Name != "" && b.Name != "" && !strings.EqualFold(a.Name, b.Name)
}

type personKey struct{}

// WithPerson returns a context in which p is asking.
func WithPerson(ctx context.Context, p Person) context.Context {
	return context.WithValue(ctx, personKey{}, p)
}

// PersonOf returns who is asking; ok is false, and the person nobody, where
// no Guard let anyone in.
func PersonOf(ctx context.Context) (p Person, ok bool) {
	p, ok = ctx.Value(personKey{}).(Person)
	return p, ok && p.Name != ""
}
