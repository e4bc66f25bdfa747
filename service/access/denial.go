package access

import (
	"encoding/json"
	"math"
	"net/http"
	"net/netip"
	"strconv"
	"time"
)

// Denial is why someone was not let in. Its texts are fixed and hold nothing
// of what was sent.
type Denial struct {
	Status     int // of HTTP
	Title      string
	Detail     string
	From       netip.Addr    // who asked; the zero Addr: unknown
	RetryAfter time.Duration // 0: trying again changes nothing
}

// Error returns the title and the detail.
func (d *Denial) Error() string { return d.Title + ": " + d.Detail }

// Headers sets the headers that go with the denial: how to sign in, and when
// to try again.
func (d *Denial) Headers(h http.Header) {
	if d.Status == http.StatusUnauthorized {
		h.Set("WWW-Authenticate", `Bearer realm="beamward"`)
	}
	if d.RetryAfter > 0 {
		h.Set("Retry-After", strconv.Itoa(int(math.Ceil(d.RetryAfter.Seconds()))))
	}
	h.Set("Cache-Control", "no-store")
}

// WriteProblem answers with a problem document (RFC 9457).
func WriteProblem(w http.ResponseWriter, _ *http.Request, d Denial) {
	d.Headers(w.Header())
	body, err := json.Marshal(struct {
		Title  string `json:"title"`
		Status int    `json:"status"`
		Detail string `json:"detail"`
	}{d.Title, d.Status, d.Detail})
	if err != nil {
		body = []byte("{}")
	}
	w.Header().Set("Content-Type", "application/problem+json")
	w.Header().Set("Content-Length", strconv.Itoa(len(body)))
	w.WriteHeader(d.Status)
	w.Write(body) // the client may be gone; there is nobody to tell
}
