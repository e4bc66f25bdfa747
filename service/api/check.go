package api

import (
	"net/http"
	"slices"
	"time"

	"beamward/closures"
	"beamward/closures/listfile"
)

// checkDoc is how a list would be understood and what it would do.
type checkDoc struct {
	Authority closures.AuthorityID `json:"authority"`
	ID        closures.ListID      `json:"id"`
	Issued    time.Time            `json:"issued"`
	Covers    spanDoc              `json:"covers"`
	Beams     []closures.BeamID    `json:"beams" doc:"none: every beam"`
	Windows   int                  `json:"window_count"`
	Digest    string               `json:"digest"`
	Format    string               `json:"format" enum:"yaml,json,csv,text"`
	Layout    string               `json:"layout" doc:"of a text: the layout that read it"`
	Lines     int                  `json:"lines"`
	Class     string               `json:"class" enum:"same,tightening,loosening" doc:"same: it is known already; tightening only if that is proven"`
	Would     string               `json:"would" enum:"nothing,take-effect,wait-for-confirmation,wait-for-second-person" doc:"what bringing it would do; its closed windows take effect at once in any case"`
	Change    changeDoc            `json:"change"`
	Understood
}

// classDoc says how a list stands to what is known.
func classify(v *View, l *closures.List) (class, would string, err error) {
	same, tightens, err := v.Book.Offer(v.Rules, l)
	switch {
	case err != nil:
		return "", "", err
	case same:
		return "same", "nothing", nil
	case tightens:
		return "tightening", "take-effect", nil
	}
	switch v.Rules.Authority(l.Authority()).Loosening {
	case closures.LooseningAtOnce:
		return "loosening", "take-effect", nil
	case closures.LooseningConfirm:
		return "loosening", "wait-for-confirmation", nil
	}
	return "loosening", "wait-for-second-person", nil
}

func (c *call) checkList() error {
	l, report, err := c.readList()
	if err != nil {
		return err
	}
	v, _ := c.view()
	class, would, err := classify(v, l)
	if err != nil {
		return err
	}
	give, err := c.slot()
	if err != nil {
		return err
	}
	defer give()
	t := l.Text()
	sum := listfile.Summarise(t)
	out := checkDoc{
		Authority: t.Authority, ID: t.ID, Issued: t.Issued.UTC(), Covers: spanDoc{t.Covers.From.UTC(), t.Covers.Until.UTC()}, Beams: slices.Clone(t.Beams),
		Windows: len(t.Windows), Digest: t.Digest.String(), Format: report.Format.String(), Layout: report.Layout, Lines: report.Lines, Class: class, Would: would,
		Change: changeOf(v, l), Understood: understoodOf(&sum),
	}
	if out.Beams == nil {
		out.Beams = []closures.BeamID{}
	}
	return c.reply(http.StatusOK, out)
}
