package api

import (
	"crypto/sha256"
	"encoding/base64"
	"net/http"
	"strings"
)

const (
	pageDefault = 100
	pageMost    = 1000
)

var (
	limitParam  = param{"limit", "entries of a page", countOf(1, pageMost)}
	cursorParam = param{"cursor", "where the page before ended, as it said; opaque", textOf(512)}
)

// page reads limit and cursor: after is what the page before ended with, empty
// for the first. A cursor fits only the query it was given for.
func (c *call) page(of string, filters ...string) (limit int, after string, err error) {
	n, err := c.count("limit", 1, pageMost, pageDefault)
	if err != nil {
		return 0, "", err
	}
	if !c.has("cursor") {
		return int(n), "", nil
	}
	raw, err := base64.RawURLEncoding.Strict().DecodeString(c.query.Get("cursor"))
	sum, rest, ok := strings.Cut(string(raw), "\x00")
	if err != nil || !ok || sum != c.filterSum(of, filters) || rest == "" {
		return 0, "", refuse(http.StatusBadRequest, "cursor: it is not one of this query", "start again without it")
	}
	return int(n), rest, nil
}

// cursor makes the cursor of the page after.
func (c *call) cursor(of, after string, filters ...string) string {
	return base64.RawURLEncoding.EncodeToString([]byte(c.filterSum(of, filters) + "\x00" + after))
}

// filterSum stands for what the query asks for.
func (c *call) filterSum(of string, filters []string) string {
	h := sha256.New()
	h.Write([]byte(of))
	for _, f := range filters {
		h.Write([]byte("\x00" + c.query.Get(f)))
	}
	return base64.RawURLEncoding.EncodeToString(h.Sum(nil)[:9])
}
