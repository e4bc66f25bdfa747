package engine

import "testing"

func TestOpensWhenAllIsClear(t *testing.T) {
	w := newSite(t, siteRules())
	if v := w.e.View(); v.Beams[0].Decision.Open || v.Started {
		t.Fatal("open before the first turn")
	}
	w.opened()
}
