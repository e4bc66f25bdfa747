package permit

import (
	"errors"
	"sync"
	"sync/atomic"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// Clock is what permits need of the service's clock.
type Clock interface {
	// Read gives the UTC wall time and the time since boot, counting suspend.
	Read() (wall time.Time, boot time.Duration)
}

// Sight is the newest decision on one beam, and when it was published. Nothing
// that it points to changes.
type Sight struct {
	Decision *closures.Decision
	Rules    *closures.Rules
	At       time.Time     // of the decision, UTC
	Boot     time.Duration // of the decision, by the boot clock
	BootID   string
	Number   uint64 // of the view: another number may be another decision
}

// Source is where decisions come from. Both methods are safe for concurrent
// use and quick.
type Source interface {
	// Sight returns what is known of a beam; false for no such beam.
	Sight(closures.BeamID) (Sight, bool)
	// Pulse returns when the newest view was published, and the rules in it.
	Pulse() (at time.Time, boot time.Duration, r *closures.Rules)
}

// StaleAfter is after how many decision intervals a decision is not believed.
const StaleAfter = 3

// slot is for how long a permit without a nonce is signed.
const slot = 10 * time.Millisecond

// Issuer makes permits. It is safe for concurrent use.
type Issuer struct {
	source    Source
	clock     Clock
	key       *Key
	simulated bool
	cache     sync.Map // of BeamID to *cell
	signed    atomic.Uint64
}

// New makes an issuer. Permits by a simulated one say so inside the signature,
// and need a key that was made for nothing else.
func New(s Source, c Clock, k *Key, simulated bool) (*Issuer, error) {
	switch {
	case s == nil || c == nil || k == nil:
		return nil, errors.New("making permits: a source, a clock and a key are needed")
	case simulated != k.throwAway:
		return nil, errors.New("making permits: simulated ones, and only they, are signed by a key that is thrown away")
	}
	return &Issuer{source: s, clock: c, key: k, simulated: simulated}, nil
}

// Key returns the key that permits are signed with.
func (i *Issuer) Key() *Key { return i.key }

// Signed returns how many permits were signed.
func (i *Issuer) Signed() uint64 { return i.signed.Load() }

// cell keeps the last permit without a nonce of one beam.
type cell struct {
	mu  sync.Mutex // held while signing, so that a crowd of readers signs once
	now atomic.Pointer[kept]
}

type kept struct {
	number      uint64
	from, until time.Duration // of its slot, by the boot clock
	wall        time.Time     // at the start of the slot
	bytes       []byte
}

func (k *kept) serves(s *Sight, wall time.Time, boot time.Duration) bool {
	return k != nil && k.number == s.Number && boot >= k.from && boot < k.until && !wall.Before(k.wall) && wall.Before(k.wall.Add(slot))
}

// Permit makes a beam's permit, with the nonce echoed. The error is a
// *closures.Error: NotFound for no such beam, Invalid for a nonce that
// ValidNonce refuses.
func (i *Issuer) Permit(beam closures.BeamID, nonce string) (wire.Permit, error) {
	s, err := i.look(beam, nonce)
	if err != nil {
		return wire.Permit{}, err
	}
	wall, boot := i.clock.Read()
	return i.sign(i.lease(&s, wall, boot, wall, nonce)), nil
}

// Answer is Permit as the bytes that a reader is sent. The caller must not
// change them.
func (i *Issuer) Answer(beam closures.BeamID, nonce string) ([]byte, error) {
	s, err := i.look(beam, nonce)
	if err != nil {
		return nil, err
	}
	// The clock is read after the view, so that a decision is never ahead.
	wall, boot := i.clock.Read()
	if nonce != "" {
		p := i.sign(i.lease(&s, wall, boot, wall, nonce))
		return wire.AppendPermit(make([]byte, 0, 4096), &p), nil
	}
	found, ok := i.cache.Load(beam)
	if !ok {
		found, _ = i.cache.LoadOrStore(beam, &cell{})
	}
	c := found.(*cell)
	if k := c.now.Load(); k.serves(&s, wall, boot) {
		return k.bytes, nil
	}
	c.mu.Lock()
	defer c.mu.Unlock()
	// Somebody else may have signed meanwhile, and time has gone by.
	if s, err = i.look(beam, nonce); err != nil {
		return nil, err
	}
	wall, boot = i.clock.Read()
	if k := c.now.Load(); k.serves(&s, wall, boot) {
		return k.bytes, nil
	}
	from := boot.Truncate(slot)
	k := &kept{number: s.Number, from: from, until: from + slot, wall: wall.Add(from - boot)}
	p := i.sign(i.lease(&s, wall, boot, k.wall.Add(slot), ""))
	k.bytes = wire.AppendPermit(make([]byte, 0, 4096), &p)
	c.now.Store(k)
	return k.bytes, nil
}

func (i *Issuer) look(beam closures.BeamID, nonce string) (Sight, error) {
	if !ValidNonce(nonce) {
		return Sight{}, closures.Errorf(closures.Invalid, "use at most 64 of A-Z a-z 0-9 _ -", "permit: the nonce cannot be echoed")
	}
	s, ok := i.source.Sight(beam)
	if !ok {
		return Sight{}, closures.Errorf(closures.NotFound, "name a configured beam", "permit: no such beam is configured")
	}
	return s, nil
}

func (i *Issuer) sign(p wire.Permit) wire.Permit {
	i.signed.Add(1)
	p.Signed = wire.Sign(wire.PayloadOf(&p), i.key.id, i.key.sign)
	return p
}

// MaxNonce bounds a reader's nonce, in characters.
const MaxNonce = 64

// ValidNonce reports whether a nonce is echoed: at most MaxNonce of the
// characters A-Z a-z 0-9 _ and -. None at all is valid.
func ValidNonce(s string) bool {
	if len(s) > MaxNonce {
		return false
	}
	for i := range len(s) {
		c := s[i]
		switch {
		case c >= 'A' && c <= 'Z', c >= 'a' && c <= 'z', c >= '0' && c <= '9', c == '_', c == '-':
		default:
			return false
		}
	}
	return true
}
