package engine

import (
	"fmt"
	"sync"
	"time"

	"beamward/closures"
	"beamward/geometry/sky"
)

// Nights are prepared from nightsBack ago until nightsAhead, in bins.
const (
	nightsBack  = 12 * time.Hour
	nightsAhead = 36 * time.Hour
	nightsRetry = time.Minute
)

// prepared is the nights that were asked for, and those that are ready and not
// taken yet. Its methods are safe for concurrent use.
type prepared struct {
	mu    sync.Mutex
	asked map[int64]time.Time // start of a bin, Unix seconds; when it was asked for
	done  map[int64]bool
	fresh []closures.Body
	epoch int        // rises when the rules change: what was begun before is of no use
	queue chan order // to Run's worker; nil: they are made in the turn
}

// order asks for one night.
type order struct {
	rules *closures.Rules
	bin   time.Time
	epoch int
}

// ready returns the nights that came since the last call.
func (p *prepared) ready() []closures.Body {
	p.mu.Lock()
	defer p.mu.Unlock()
	fresh := p.fresh
	p.fresh = nil
	return fresh
}

// forget has all nights made anew.
func (p *prepared) forget() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.asked, p.done, p.fresh = nil, nil, nil
	p.epoch++
}

// missing returns what must be made, and notes that it was asked for.
func (p *prepared) missing(r *closures.Rules, at time.Time) []order {
	p.mu.Lock()
	defer p.mu.Unlock()
	var out []order
	if p.asked == nil {
		p.asked, p.done = map[int64]time.Time{}, map[int64]bool{}
	}
	// The present bin first.
	for _, off := range [...]time.Duration{0, 12 * time.Hour, -nightsBack, 24 * time.Hour, nightsAhead} {
		bin := sky.Bin(at.Add(off)).From
		key := bin.Unix()
		if p.done[key] {
			continue
		}
		if asked, ok := p.asked[key]; ok && at.Sub(asked).Abs() < nightsRetry {
			continue
		}
		p.asked[key] = at
		out = append(out, order{rules: r, bin: bin, epoch: p.epoch})
	}
	return out
}

// put takes in a night that was made.
func (p *prepared) put(o order, n *sky.Night) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if o.epoch != p.epoch || p.done == nil {
		return
	}
	p.done[o.bin.Unix()] = true
	p.fresh = append(p.fresh, closures.NightReady{Night: n})
	for key := range p.done { // what is long past is never asked for again
		if o.bin.Unix()-key > int64((4*24*time.Hour)/time.Second) {
			delete(p.done, key)
			delete(p.asked, key)
		}
	}
}

// nightsWanted has the nights about an instant made: by Run's worker, or here
// where a Stepper drives.
func (e *Engine) nightsWanted(at time.Time) {
	for _, o := range e.nights0.missing(e.rules, at) {
		if e.nights0.queue == nil {
			e.makeNight(o)
			continue
		}
		select {
		case e.nights0.queue <- o:
		default: // asked for again when nightsRetry has passed
		}
	}
}

func (e *Engine) makeNight(o order) {
	defer func() {
		if caught := recover(); caught != nil {
			e.opt.Report(fmt.Errorf("preparing the sky of %s: %v", o.bin.Format(time.RFC3339), caught))
		}
	}()
	n, err := e.opt.Prepare(o.rules, o.bin)
	if err != nil {
		e.opt.Report(fmt.Errorf("preparing the sky of %s: %w", o.bin.Format(time.RFC3339), err))
		return
	}
	e.nights0.put(o, n)
	poke(e.ripe)
}
