package listfile

import (
	"errors"

	"beamward/closures"
)

// Explained turns what closures.Index says of a text into a *Refusal with the
// lines where its regions and windows stand. Other errors, and nil, it returns
// as they are.
func Explained(t *closures.ListText, err error) error {
	var problems closures.ListProblems
	if !errors.As(err, &problems) {
		return err
	}
	var f faults
	for _, p := range problems {
		at := place{}
		switch {
		case p.Window >= 0 && p.Window < len(t.Windows):
			w := &t.Windows[p.Window]
			if p.Window < len(t.Lines) {
				at.line = t.Lines[p.Window]
			}
			at.text = appendWindow(nil, regionID(t, w), w)
		case p.Region >= 0 && p.Region < len(t.Regions):
			at = place{t.Regions[p.Region].Line, []byte(t.Regions[p.Region].ID)}
		}
		f.add(at, p.Cause, p.Mend)
	}
	return f.refusal()
}
