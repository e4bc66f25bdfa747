package replay

import (
	"context"
	"errors"
	"math"
	"slices"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/geometry/sky"
	"beamward/service/journal"
)

// Bounds of what is read backwards for a beginning amid a run.
const (
	mostBack  = 20_000 // entries
	leastWarm = 30 * time.Second
	mostWarm  = 15 * time.Minute
)

// choose finds where to begin: at the run's beginning where that is near, else
// at what was kept long enough before.
func (x *explainer) choose(ctx context.Context) error {
	seq := x.entry.Seq
	var gone *journal.PrunedError
	b, any, err := find(ctx, x.src, journal.Query{To: seq, Kinds: []string{KindBegun}, NewestFirst: true})
	switch {
	case errors.As(err, &gone):
		x.note = "the run's beginning is pruned"
	case err != nil:
		return err
	case any:
		x.begin = b.Seq
		body, err := form[begun](&b)
		if err != nil {
			return err
		}
		if x.life, err = body.run(&b); err != nil {
			return err
		}
		if seq-b.Seq <= x.near {
			x.from, x.whole = b.Seq, true
			return nil
		}
	}
	return x.warm(ctx)
}

// warm makes the state from what was kept some minutes before, and from the
// newest of what comes seldom. It leaves from at zero where it cannot.
func (x *explainer) warm(ctx context.Context) error {
	rules, err := x.rulesAt(ctx, x.entry.Seq)
	if err != nil || rules == nil {
		return x.alone(err)
	}
	k, any, err := find(ctx, x.src, journal.Query{
		From: x.begin, To: x.entry.Seq - 1, Until: x.entry.At.Add(-settles(rules)), Kinds: []string{journal.KindDurable}, NewestFirst: true,
	})
	switch {
	case err == nil && !any && x.begin > 0: // the run is short and dense
		x.from, x.whole = x.begin, true
		return nil
	case err != nil || !any:
		return x.alone(err)
	}
	if rules, err = x.rulesAt(ctx, k.Seq); err != nil || rules == nil {
		return x.alone(err)
	}
	x.shelf.force = rules
	d, err := wire.DecodeDurable(k.Body, x.shelf.resolver())
	if err != nil {
		return unread(&k, err)
	}
	run := x.life
	run.At = k.At
	if run.BootID == "" {
		run.BootID = "unknown"
	}
	if err := x.start(run, rules, d); err != nil {
		return err
	}
	first, err := x.seldom(ctx, &k, rules)
	if err != nil {
		return x.alone(err)
	}
	tick := closures.Fact{At: k.At, Body: closures.Tick{}}
	x.batch = append(first, tick)
	if x.apply(tick) == failed {
		return x.alone(nil)
	}
	x.from, x.last = k.Seq, k.Seq
	return nil
}

// alone notes that nothing can be replayed, where err is no more than that.
func (x *explainer) alone(err error) error {
	var gone *journal.PrunedError
	if err != nil && !errors.As(err, &gone) {
		return err
	}
	x.leave()
	if x.note == "" {
		x.note = "what came before it is not on record any more"
	}
	return nil
}

// rulesAt finds the rules in force at an entry, by what the newest decision on
// record says; nil where that is not known.
func (x *explainer) rulesAt(ctx context.Context, seq uint64) (*closures.Rules, error) {
	e, any, err := find(ctx, x.src, journal.Query{From: x.begin, To: seq, Kinds: []string{wire.KindDecision}, NewestFirst: true})
	if err != nil {
		return nil, err
	}
	name := x.life.Rules
	if any {
		d, err := wire.DecodeDecision(e.Body)
		if err != nil {
			return nil, unread(&e, err)
		}
		name = d.Rules
	}
	if name.IsZero() {
		return nil, nil
	}
	return x.shelf.theRules(name)
}

// settles bounds how long it takes until all that comes again by itself has
// come again.
func settles(r *closures.Rules) time.Duration {
	d := r.Aircraft.LostAfter
	for i := range r.Beams {
		b := &r.Beams[i]
		d = max(d, b.Aim.StaleAfter, b.FeedbackStale, b.ReopenAfter)
	}
	for i := range r.Sources {
		d = max(d, r.Sources[i].WarmUp)
		if r.Sources[i].Required {
			d = max(d, r.Sources[i].StaleAfter)
		}
	}
	for i := range r.Neighbours {
		d = max(d, r.Neighbours[i].StaleAfter)
	}
	return min(d+leastWarm, mostWarm)
}

// seldom gathers the facts with which a state amid a run begins: that it is
// started, the sky, and the newest word of each subject that speaks seldom.
// None has a number, so that those which follow are in order.
func (x *explainer) seldom(ctx context.Context, k *journal.Entry, rules *closures.Rules) ([]closures.Fact, error) {
	first := []closures.Fact{{At: k.At, Body: closures.Started{}}}
	for _, off := range [...]time.Duration{-12 * time.Hour, 0, 12 * time.Hour} {
		n, err := x.shelf.night(sky.Bin(k.At.Add(off)).From)
		if err != nil {
			return nil, err
		}
		first = append(first, closures.Fact{At: k.At, Body: closures.NightReady{Night: n}})
	}
	forget := time.Duration(0)
	for i := range rules.Neighbours {
		forget = max(forget, rules.Neighbours[i].ForgetAfter)
	}
	var back []closures.Fact
	for _, q := range [...]journal.Query{
		{Kinds: []string{wire.KindWeather, wire.KindWatch, wire.KindSighting}},
		{Kinds: []string{wire.KindAim}, Since: k.At.Add(-forget)},
	} {
		q.From, q.To, q.NewestFirst = x.begin, k.Seq, true
		some, err := x.backwards(ctx, q)
		if err != nil {
			return nil, err
		}
		back = append(back, some...)
	}
	slices.SortFunc(back, func(a, b closures.Fact) int { return int(int64(a.Seq) - int64(b.Seq)) })
	for _, f := range back {
		x.newest.see(&f)
		f.Seq = 0
		if b, is := f.Body.(closures.Sighted); is { // itself it was kept, where it still counts
			f.Body = closures.Heard{Source: b.Source, Said: b.Said, MessagesPerMinute: math.NaN()}
		}
		first = append(first, f)
	}
	return first, nil
}

// backwards gathers the newest fact of each subject, at most mostBack entries
// back. Where entries were pruned it ends there.
func (x *explainer) backwards(ctx context.Context, q journal.Query) ([]closures.Fact, error) {
	var out []closures.Fact
	seen := map[subject]bool{}
	n := 0
	err := x.src.Read(ctx, q, func(e journal.Entry) error {
		if n++; n > mostBack {
			return journal.ErrStop
		}
		f, err := wire.DecodeBody(e.Kind, e.Body, x.shelf.resolver())
		if err != nil {
			return unread(&e, err)
		}
		of := subjectsOf(f.Body)
		if len(of) == 0 || seen[of[0]] {
			return nil
		}
		seen[of[0]] = true
		f.Seq, f.At = e.Seq, e.At
		out = append(out, f)
		return nil
	})
	var gone *journal.PrunedError
	if errors.As(err, &gone) {
		err = nil
	}
	return out, err
}
