package api

import (
	"net/http"
	"strings"
)

func (c *call) permit() error {
	nonce := c.query.Get("nonce")
	if !validNonce(nonce) {
		return badQuery("nonce", "it cannot be echoed", "use at most 64 of A-Z a-z 0-9 _ -")
	}
	v := c.api.options.Engine.View()
	r, _, err := c.theBeam(v)
	if err != nil {
		return err
	}
	if c.api.options.Permits == nil {
		return refuse(http.StatusServiceUnavailable, "this service issues no permits", "")
	}
	body, err := c.api.options.Permits.Permit(r.ID, nonce)
	if err != nil {
		return err
	}
	return c.send(http.StatusOK, jsonType, body)
}

const maxNonce = 64

// validNonce reports whether a nonce is echoed: at most maxNonce characters
// that need no escape in a URL or in JSON. None at all is valid.
func validNonce(s string) bool {
	return len(s) <= maxNonce && !strings.ContainsFunc(s, func(r rune) bool {
		return !(r >= 'A' && r <= 'Z' || r >= 'a' && r <= 'z' || r >= '0' && r <= '9' || r == '_' || r == '-')
	})
}

func (c *call) permitKey() error {
	if c.api.options.Permits == nil {
		return refuse(http.StatusServiceUnavailable, "this service issues no permits", "")
	}
	return c.send(http.StatusOK, c.gives, c.api.options.Permits.Key())
}
