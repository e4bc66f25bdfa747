package permit

import (
	"encoding/json"
	"errors"
	"net/http"
	"net/url"
	"strconv"
	"strings"

	"beamward/closures"
	"beamward/closures/wire"
)

// The three routes.
const (
	routeHealth = "/healthz"
	routeKey    = "/v1/permit-key"
	beamsBefore = "/v1/beams/"
	permitAfter = "/permit"
)

// Handler serves exactly the permit, the permit's key and the liveness of the
// decisions, by GET and HEAD. Everything else is a problem document (RFC 9457).
// It redirects nowhere and echoes nothing but a valid nonce.
type Handler struct{ issuer *Issuer }

// NewHandler makes the handler of an issuer's permits.
func NewHandler(i *Issuer) *Handler { return &Handler{i} }

// ServeHTTP answers one request.
func (h *Handler) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	path := r.URL.EscapedPath()
	beam, isPermit := beamOf(path)
	if !isPermit && path != routeHealth && path != routeKey {
		problem(w, http.StatusNotFound, "this listener serves permits, the permit key and healthz")
		return
	}
	if r.Method != http.MethodGet && r.Method != http.MethodHead {
		w.Header().Set("Allow", "GET, HEAD")
		problem(w, http.StatusMethodNotAllowed, "use GET or HEAD")
		return
	}
	if r.ContentLength != 0 {
		w.Header().Set("Connection", "close")
		problem(w, http.StatusBadRequest, "send no body")
		return
	}
	nonce, ok := nonceOf(r.URL.RawQuery, isPermit)
	switch {
	case !ok:
		problem(w, http.StatusBadRequest, "the only parameter is one nonce of a permit: at most 64 of A-Z a-z 0-9 _ -")
	case path == routeKey:
		answer(w, http.StatusOK, "application/jwk+json", h.issuer.key.jwk)
	case path == routeHealth && h.issuer.Fresh():
		answer(w, http.StatusOK, "application/json", []byte(`{"status":"ok"}`))
	case path == routeHealth:
		problem(w, http.StatusServiceUnavailable, "no decision was made for three decision intervals")
	default:
		h.permit(w, beam, nonce)
	}
}

func (h *Handler) permit(w http.ResponseWriter, beam closures.BeamID, nonce string) {
	b, err := h.issuer.Answer(beam, nonce)
	if err == nil {
		answer(w, http.StatusOK, "application/json", b)
		return
	}
	var e *closures.Error
	if errors.As(err, &e) && e.Code == closures.NotFound {
		problem(w, http.StatusNotFound, e.Error())
		return
	}
	problem(w, http.StatusInternalServerError, "no permit can be made")
}

// beamOf finds the beam's name in a path. A name needs no escapes.
func beamOf(path string) (closures.BeamID, bool) {
	rest, ok := strings.CutPrefix(path, beamsBefore)
	name, also := strings.CutSuffix(rest, permitAfter)
	return closures.BeamID(name), ok && also && closures.ValidName(name)
}

// nonceOf reads the query: nothing, or one nonce where there can be one.
func nonceOf(query string, takes bool) (string, bool) {
	if query == "" {
		return "", true
	}
	values, err := url.ParseQuery(query)
	if err != nil || !takes || len(values) != 1 || len(values["nonce"]) != 1 {
		return "", false
	}
	nonce := values["nonce"][0]
	return nonce, ValidNonce(nonce)
}

func answer(w http.ResponseWriter, status int, kind string, body []byte) {
	head := w.Header()
	head["Content-Type"] = []string{kind}
	head["Content-Length"] = []string{strconv.Itoa(len(body))}
	head["Cache-Control"] = noStore
	head["X-Content-Type-Options"] = noSniff
	w.WriteHeader(status)
	_, _ = w.Write(body) // net/http leaves it out of an answer to HEAD
}

var (
	noStore = []string{"no-store"}
	noSniff = []string{"nosniff"}
)

func problem(w http.ResponseWriter, status int, detail string) {
	b, err := json.Marshal(wire.Problem{Title: http.StatusText(status), Status: status, Detail: detail})
	if err != nil {
		w.WriteHeader(http.StatusInternalServerError)
		return
	}
	answer(w, status, wire.ProblemType, b)
}
