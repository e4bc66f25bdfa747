package replay

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

func (w *words) coming(b *BeamTold) {
	if len(b.Coming) > 0 {
		w.head("To come")
		for i := range b.Coming {
			f := &b.Coming[i]
			w.line("  %-16s %s", f.Code, strings.TrimPrefix(over(f.From, f.Until), ", ")+": "+after("", f.Source, ": ")+f.Detail+after(", list ", f.List, "")+after(", region ", cited("", f.Region), ""))
		}
	}
	if len(b.Cautions) > 0 {
		w.head("Left clear by rule")
		for _, c := range b.Cautions {
			w.line("  %-16s %s", c.Code, after("", c.Source, ": ")+c.Detail)
		}
	}
}

func (w *words) aim(a *AimTold) {
	if a == nil {
		return
	}
	w.head("Aim")
	if a.RADeg != nil && a.DecDeg != nil {
		w.line("  RA %.4f°, Dec %+.4f° (ICRS)", *a.RADeg, *a.DecDeg)
	}
	if a.AzDeg != nil && a.ElDeg != nil {
		w.line("  azimuth %.4f°, elevation %.4f° (airless)", *a.AzDeg, *a.ElDeg)
	}
	s := fmt.Sprintf("  error %s arcsec, %s, stated as %s", figure(a.ErrorArcsec), a.Motion, a.Frame) + after(", by ", cited("", a.From), "") + after(", target ", cited("", a.Target), "")
	s += ", said " + stamp(a.Said)
	if a.RestsOn != 0 {
		s += fmt.Sprintf(" (entry %d)", a.RestsOn)
	}
	w.line("%s", s)
}

func (w *words) inputs(b *BeamTold) {
	w.head("Inputs and their ages")
	for _, in := range b.Inputs {
		s := "never heard"
		if in.AgeS != nil {
			s = fmt.Sprintf("%s s of %s s", seconds(*in.AgeS), seconds(in.LimitS))
			if *in.AgeS > in.LimitS {
				s += ", stale"
			}
		}
		if in.RestsOn != 0 {
			s += fmt.Sprintf(" (entry %d)", in.RestsOn)
		}
		w.line("  %-16s %s", in.Source, s)
	}
}

func seconds(s float64) string {
	return strconv.FormatFloat(math.Round(s*1000)/1000, 'f', -1, 64)
}

func (w *words) inForce(b *BeamTold) {
	w.head("In force")
	for _, l := range b.Lists {
		w.line("  list %s/%s, %s, covers %s to %s%s%s", l.Authority, l.ID, l.Status, stamp(l.From), stamp(l.Until), after(", brought by ", cited("", l.By), ""), after(", confirmed by ", cited("", l.Confirmed), ""))
	}
	for _, h := range b.Holds {
		w.line("  hold %s by %s: %q%s%s", h.ID, cited("", h.By), h.Reason, over(h.From, h.Until), pick(h.Region, ", for a part of the sky", ""))
	}
	w.line("  rules %s", b.Rules)
	w.line("  lists %s", b.ListsSum)
}
