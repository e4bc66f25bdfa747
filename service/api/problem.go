package api

import (
	"context"
	"encoding/json"
	"errors"
	"math"
	"net"
	"net/http"
	"strconv"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
	"beamward/service/access"
)

// refusal is a request that is not done, and why. Its texts are fixed, or are
// input that was cut and escaped.
type refusal struct {
	wire.Problem
	retry time.Duration // 0: trying again changes nothing
	allow string        // of a 405
	more  any           // a whole document in place of the problem's own, with the problem's members
}

// Error gives title and detail.
func (r *refusal) Error() string { return r.Problem.Error() }

// refuse makes a refusal; the title is the status's own.
func refuse(status int, detail, mend string) *refusal {
	r := &refusal{Problem: wire.Problem{Title: http.StatusText(status), Status: status, Detail: detail}}
	if mend != "" {
		r.Errors = []wire.ProblemEntry{{Detail: detail, Mend: mend}}
	}
	return r
}

// after says when to try again.
func (r *refusal) after(d time.Duration) *refusal {
	r.retry = d
	return r
}

// statusOf is the one mapping of the core's errors.
func statusOf(code closures.ErrorCode) int {
	switch code {
	case closures.Invalid:
		return http.StatusUnprocessableEntity
	case closures.NotFound:
		return http.StatusNotFound
	case closures.Conflict:
		return http.StatusConflict
	case closures.Changed:
		return http.StatusPreconditionFailed
	case closures.Busy:
		return http.StatusTooManyRequests
	}
	return http.StatusInternalServerError
}

// refusalOf turns any error into what a client may see; internal says that its
// text must stay inside.
func refusalOf(err error) (r *refusal, internal bool) {
	var core *closures.Error
	var tooLong *http.MaxBytesError
	var denial *access.Denial
	var network net.Error
	switch {
	case errors.As(err, &r):
		return r, false
	case errors.As(err, &core) && core.Code != closures.Internal:
		r = refuse(statusOf(core.Code), core.Message, core.Mend)
		if core.Code == closures.Busy {
			r.retry = time.Second
		}
		return r, false
	case errors.As(err, &tooLong):
		return refuse(http.StatusRequestEntityTooLarge, "the body is over "+strconv.FormatInt(tooLong.Limit, 10)+" bytes", "send less at a time"), false
	case errors.As(err, &denial):
		r = refuse(denial.Status, denial.Detail, "")
		r.Title, r.retry = denial.Title, denial.RetryAfter
		return r, false
	case errors.As(err, &network) && network.Timeout():
		return refuse(http.StatusRequestTimeout, "the body did not arrive in time", "send it again"), false
	case errors.Is(err, context.DeadlineExceeded), errors.Is(err, context.Canceled):
		return refuse(http.StatusServiceUnavailable, "the service did not get to it in time", "look whether it was done, then try again").after(time.Second), false
	}
	return refuse(http.StatusInternalServerError, "something went wrong inside the service; its log tells more", ""), true
}

// fail answers with a problem document. What was written before stands.
func (a *API) fail(w http.ResponseWriter, r *http.Request, err error) {
	out, internal := refusalOf(err)
	if internal {
		a.options.Report(err)
	}
	h := w.Header()
	var doc any = out.Problem
	if out.more != nil {
		doc = out.more
	}
	body, err := json.Marshal(doc)
	if err != nil {
		a.options.Report(err)
		body = []byte(`{"type":"about:blank","title":"Internal Server Error","status":500}`)
		out.Status = http.StatusInternalServerError
	}
	for _, name := range []string{"Content-Encoding", "Content-Disposition", "Etag", "Last-Modified"} {
		h.Del(name)
	}
	if out.retry > 0 {
		h.Set("Retry-After", strconv.Itoa(int(math.Ceil(out.retry.Seconds()))))
	}
	if out.allow != "" {
		h.Set("Allow", out.allow)
	}
	if out.Status == http.StatusUnauthorized {
		h.Set("WWW-Authenticate", `Bearer realm="beamward"`)
	}
	h.Set("Content-Type", wire.ProblemType)
	h.Set("Content-Length", strconv.Itoa(len(body)))
	w.WriteHeader(out.Status)
	_, _ = w.Write(body) // the client may be gone; there is nobody to tell
}
