package api

import (
	"crypto/sha256"
	"encoding/hex"
	"net/http"
	"strings"

	"beamward/closures"
)

// tagOf makes an entity tag of what a person must have seen before changing
// it. It stands for that, not for every byte of the answer, whose ages differ
// with each.
func tagOf(parts ...string) string {
	h := sha256.New()
	for _, p := range parts {
		h.Write([]byte(p))
		h.Write([]byte{0})
	}
	return `"` + hex.EncodeToString(h.Sum(nil)[:16]) + `"`
}

// beamTag changes with the beam's state, its reasons, what waits for a person,
// and the rules.
func beamTag(v *View, b *BeamView) string {
	d := b.Decision
	state := "shuttered"
	if d.Open {
		state = "open"
	}
	return tagOf("beam", v.BootID, string(d.Beam), state, strings.Join(d.Codes.Names(), ","), strings.Join(v.known(d.Beam).Need.Names(), ","), d.Rules.String())
}

// listTag changes with the list, where it stands, and who asked to withdraw it.
func listTag(e *closures.Entry) string {
	return tagOf("list", string(e.List.Authority()), string(e.List.ID()), e.List.Digest().String(), e.Status.String(), e.Asked)
}

// holdTag is the hold's own: a hold never changes but ends.
func holdTag(h *closures.HoldPlaced) string {
	return tagOf("hold", string(h.ID), string(h.Beam), h.By, h.Placed.String())
}

// ifMatch refuses with 412 where the client has seen something else (RFC 9110,
// section 13.1.1). given is false where it did not say what it has seen.
func (c *call) ifMatch(tag string) (given bool, err error) {
	all := c.r.Header.Values("If-Match")
	if len(all) == 0 {
		return false, nil
	}
	for _, one := range strings.Split(strings.Join(all, ","), ",") {
		if one = strings.TrimSpace(one); one == "*" || one == tag {
			return true, nil
		}
	}
	return true, refuse(http.StatusPreconditionFailed, "it changed since you looked", "look again, then decide")
}
