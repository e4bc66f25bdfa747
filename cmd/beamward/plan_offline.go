package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"runtime"
	"sync"
	"time"

	"beamward/closures"
	"beamward/closures/plan"
	"beamward/closures/wire"
	"beamward/geometry/span"
	"beamward/service/client"
	"beamward/service/render"
)

// planOffline plans on the configuration and the lists in its folders.
func planOffline(ctx context.Context, out *console, from *configFlag, ask *planAsk, table io.Reader) error {
	cfg, err := from.load()
	if err != nil {
		return err
	}
	beam, err := beamOf(cfg.Rules, ask.beam)
	if err != nil {
		return err
	}
	ask.whole()
	over := span.Span{From: ask.over.From, Until: ask.over.Until}
	if over.Empty() || over.Length() > plan.MaxLength {
		return usagef("--until %s: make it after --from, at most 14 days", clockTime(over.Until))
	}
	targets, err := plan.ReadTargets(table)
	if err != nil {
		return badTargets(err)
	}
	s, err := stock(cfg, ask.lists)
	if err != nil {
		return err
	}
	foreseen, err := s.foreseen(over.From)
	if err != nil {
		return err
	}
	nights, err := plan.Nights(cfg.Rules, over)
	if err != nil {
		return err
	}
	p, err := plan.Prepare(foreseen, beam.ID, over, nights)
	if err != nil {
		return err
	}
	out.say("planned offline, on %d lists as if each were confirmed; holds are not known here", len(foreseen.Lists))
	head := client.Plan{
		Beam: beam.ID, From: over.From, Until: over.Until, RulesDigest: cfg.Rules.Digest.String(), ListsDigest: s.book.Digest().String(),
		LeftOut: (closures.AllCodes &^ closures.ForeseeableCodes()).Names(), Notice: render.Notice,
	}
	w := planWriterFor(out, ask.format, cfg.Rules.Site.Name)
	w.begin(&head)
	drawn := chartOf(cfg, beam.ID, over, nights)
	shown := out.watch("targets planned")
	err = eachTarget(ctx, p, targets, func(i int, a *plan.Planned) error {
		shown.at(i+1, len(targets))
		t := targetOf(beam.ID, a)
		w.target(&t)
		if ask.chart != "" {
			drawn.Rows = append(drawn.Rows, render.ChartRow{Name: a.Target.Name, Allowed: a.Spans, Blocked: a.Blocked})
		}
		return out.broken
	})
	shown.end()
	if err = errors.Join(err, w.end()); err != nil || ask.chart == "" {
		return err
	}
	return drawChart(ask.chart, &drawn)
}

// batch is how many targets are planned before their results are written.
const batch = 256

// eachTarget plans on as many processors as there are, and gives the results in
// the order of the table.
func eachTarget(ctx context.Context, p *plan.Planner, targets []plan.Target, take func(int, *plan.Planned) error) error {
	workers := runtime.GOMAXPROCS(0)
	scratch := make([]plan.Scratch, workers)
	var results [batch]plan.Planned
	var errs [batch]error
	for from := 0; from < len(targets); from += batch {
		part := targets[from:min(from+batch, len(targets))]
		var all sync.WaitGroup
		for w := range workers {
			all.Go(func() {
				for i := w; i < len(part); i += workers {
					results[i], errs[i] = p.Target(&part[i], &scratch[w])
				}
			})
		}
		all.Wait()
		if err := ctx.Err(); err != nil {
			return err
		}
		for i := range part {
			if errs[i] != nil {
				return fmt.Errorf("target %s: %w", printable(part[i].Name), errs[i])
			}
			if err := take(from+i, &results[i]); err != nil {
				return err
			}
		}
	}
	return nil
}

// targetOf puts a result into the shape in which the service gives it.
func targetOf(beam closures.BeamID, a *plan.Planned) client.Target {
	out := client.Target{
		Name: a.Target.Name, Allowed: spansOf(a.Spans), AllowedS: a.Spans.Total().Seconds(), Usable: spansOf(a.Usable),
		Blocked: []client.Closure{}, Cautions: []wire.Caution{},
	}
	for i := range a.Blocked {
		f := &a.Blocked[i]
		out.Blocked = append(out.Blocked, client.Closure{
			Beam: string(beam), Code: f.Code.String(), Source: string(f.Source), From: instant(f.Over.From), Until: instant(f.Over.Until),
			List: string(f.List), Region: f.Region, Ref: f.Ref, Detail: f.Detail,
		})
	}
	for i := range a.Cautions {
		out.Cautions = append(out.Cautions, wire.CautionOf(&a.Cautions[i]))
	}
	return out
}

func spansOf(set span.Set) []client.Span {
	out := []client.Span{}
	for _, s := range set {
		out = append(out, client.Span{From: s.From.UTC(), Until: s.Until.UTC()})
	}
	return out
}

func instant(t time.Time) *time.Time {
	t = t.UTC()
	return &t
}
