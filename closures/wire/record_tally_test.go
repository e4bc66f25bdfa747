package wire

import (
	"encoding/hex"
	"testing"
	"time"

	"beamward/closures"
)

// The form is written out by hand from its description.
func TestTheTallysForm(t *testing.T) {
	at := time.Unix(0, 0x1B2C3D4E5F607182).UTC()
	d := closures.Decision{
		Seq: 0x0102030405060708, Beam: "north", At: at, Open: true, OpenUntil: at.Add(1),
		Codes: closures.Codes(0).With(closures.CodeHold), Reasons: make([]closures.Finding, 2),
	}
	const want = "0102030405060708" + "1b2c3d4e5f607182" + "01" + "00000040" + "1b2c3d4e5f607183" + "00000005" + "00000002" + "6e6f727468"
	if got := hex.EncodeToString(AppendDecision(nil, &d)); got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
	shut := closures.Decision{Beam: "north", At: at}
	const none = "0000000000000000" + "1b2c3d4e5f607182" + "00" + "00000000" + "ffffffffffffffff" + "00000005" + "00000000" + "6e6f727468"
	if got := hex.EncodeToString(AppendDecision([]byte{}, &shut)); got != none {
		t.Errorf("shuttered: got  %s\nwant %s", got, none)
	}
}

// Each field of the form changes it.
func TestTheTallysFormTellsDecisionsApart(t *testing.T) {
	at := time.Date(2031, 2, 14, 1, 0, 0, 0, time.UTC)
	base := closures.Decision{Seq: 7, Beam: "north", At: at}
	was := string(AppendDecision(nil, &base))
	for name, change := range map[string]func(*closures.Decision){
		"seq":        func(d *closures.Decision) { d.Seq++ },
		"beam":       func(d *closures.Decision) { d.Beam = "south" },
		"at":         func(d *closures.Decision) { d.At = at.Add(1) },
		"open":       func(d *closures.Decision) { d.Open = true },
		"codes":      func(d *closures.Decision) { d.Codes = d.Codes.With(closures.CodeFault) },
		"open_until": func(d *closures.Decision) { d.OpenUntil = at },
		"reasons":    func(d *closures.Decision) { d.Reasons = make([]closures.Finding, 1) },
	} {
		d := base
		change(&d)
		if string(AppendDecision(nil, &d)) == was {
			t.Errorf("%s is not in the form", name)
		}
	}
}
