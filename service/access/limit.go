package access

import (
	"net"
	"net/netip"
	"sync"
	"time"

	"golang.org/x/time/rate"
)

// Failed attempts that one address may make before it is answered 429.
const (
	failBurst  = 10
	failEvery  = 6 * time.Second // one more after each
	failsKept  = 1024            // addresses that are told apart
	failWindow = failBurst * failEvery
)

// fails counts failed attempts by address. A token cannot be guessed, so the
// limit is there to keep attempts cheap and logs short, and it never stands in
// the way of a credential that is right.
type fails struct {
	mu   sync.Mutex
	by   map[netip.Prefix]*failing
	rest *rate.Limiter // all further addresses together
}

type failing struct {
	limit *rate.Limiter
	last  time.Time
}

// allow counts one failure and reports whether its address is within the
// limit.
func (f *fails) allow(from netip.Addr) bool {
	now := time.Now()
	key := network(from)
	f.mu.Lock()
	defer f.mu.Unlock()
	if f.by == nil {
		f.by = map[netip.Prefix]*failing{}
		f.rest = rate.NewLimiter(rate.Every(failEvery), failBurst)
	}
	one := f.by[key]
	if one == nil {
		if len(f.by) >= failsKept {
			for k, old := range f.by {
				if now.Sub(old.last) > failWindow {
					delete(f.by, k)
				}
			}
		}
		if len(f.by) >= failsKept {
			return f.rest.AllowN(now, 1)
		}
		one = &failing{limit: rate.NewLimiter(rate.Every(failEvery), failBurst)}
		f.by[key] = one
	}
	one.last = now
	return one.limit.AllowN(now, 1)
}

// network is what one sender can be taken to own: an IPv4 address, or an IPv6
// /64.
func network(a netip.Addr) netip.Prefix {
	a = a.Unmap().WithZone("")
	bits := 32
	if a.Is6() {
		bits = 64
	}
	p, err := a.Prefix(bits)
	if err != nil { // the zero Addr: a sender without an address
		return netip.Prefix{}
	}
	return p
}

// remote returns the address in host:port; the zero Addr when there is none.
func remote(hostPort string) netip.Addr {
	if ap, err := netip.ParseAddrPort(hostPort); err == nil {
		return ap.Addr()
	}
	if host, _, err := net.SplitHostPort(hostPort); err == nil {
		hostPort = host
	}
	a, err := netip.ParseAddr(hostPort)
	if err != nil {
		return netip.Addr{}
	}
	return a
}
