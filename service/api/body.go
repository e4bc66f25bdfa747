package api

import (
	"encoding/json"
	"errors"
	"io"
	"mime"
	"net/http"
	"slices"
	"strconv"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"beamward/closures/wire"
)

// checkBody holds the headers of a request with a body against what the route
// takes.
func (c *call) checkBody(rt *route) error {
	if rt.optional && c.r.ContentLength == 0 && c.r.Header.Get("Content-Type") == "" {
		return nil
	}
	if e := c.r.Header.Get("Content-Encoding"); e != "" && !strings.EqualFold(e, "identity") {
		return refuse(http.StatusUnsupportedMediaType, "bodies are taken without a content encoding", "send it plain")
	}
	if _, ok := c.mediaType(); !ok || !slices.Contains(rt.takes, c.takes()) {
		return refuse(http.StatusUnsupportedMediaType, "the body is of a media type that is not taken here", "set Content-Type to "+strings.Join(rt.takes, ", "))
	}
	return nil
}

// mediaType returns the body's media type. Text is UTF-8 and no other.
func (c *call) mediaType() (string, bool) {
	all := c.r.Header.Values("Content-Type")
	if len(all) != 1 {
		return "", false
	}
	t, params, err := mime.ParseMediaType(all[0])
	if err != nil {
		return "", false
	}
	for name, value := range params {
		if name != "charset" || !strings.EqualFold(value, "utf-8") && !strings.EqualFold(value, "us-ascii") {
			return "", false
		}
	}
	return t, true
}

func (c *call) takes() string {
	t, _ := c.mediaType()
	return t
}

// body returns the request's body, held to a number of bytes and a time. The
// answer has its own time after that.
func (c *call) body(limit int64, within time.Duration) *incoming {
	control, now := http.NewResponseController(c.w), time.Now()
	_ = control.SetReadDeadline(now.Add(within))
	_ = control.SetWriteDeadline(now.Add(within + c.api.limits.Answer))
	return &incoming{in: http.MaxBytesReader(c.w, c.r.Body, limit)}
}

// incoming is a body that remembers why it could not be read on, which its
// reader may have told as something else.
type incoming struct {
	in  io.Reader
	err error
}

func (b *incoming) Read(p []byte) (int, error) {
	n, err := b.in.Read(p)
	if err != nil && err != io.EOF {
		b.err = err
	}
	return n, err
}

// longer gives the request another while, once its body is read. A connection on which reading
// has run out of time would end the request's context, too.
func (c *call) longer(d time.Duration) {
	control, end := http.NewResponseController(c.w), time.Now().Add(d)
	_ = control.SetReadDeadline(end)
	_ = control.SetWriteDeadline(end)
}

// read decodes a JSON body strictly into what into points to.
func (c *call) read(into any) error {
	data, err := io.ReadAll(c.body(c.api.limits.Body, c.api.limits.BodyTime))
	if err != nil {
		return err
	}
	if len(data) == 0 && c.r.Header.Get("Content-Type") == "" {
		return nil // only routes whose body may be left out get here
	}
	return decode(data, into)
}

// decode is wire.Strict whose error a client may see.
func decode(data []byte, into any) error {
	if len(data) == 0 {
		return refuse(http.StatusBadRequest, "the body is empty", "send a JSON object")
	}
	if err := wire.Strict(data, into); err != nil {
		var s *wire.StrictError
		if !errors.As(err, &s) {
			return err
		}
		r := refuse(http.StatusBadRequest, "the JSON cannot be taken", "")
		r.Errors = []wire.ProblemEntry{wire.ProblemOf(0, s)}
		return r
	}
	return nil
}

// wrong is a JSON body that was read and cannot be meant.
func wrong(pointer, cause, mend string) *refusal {
	r := refuse(http.StatusUnprocessableEntity, strings.TrimPrefix(pointer, "/")+": "+cause, "")
	r.Errors = []wire.ProblemEntry{{Pointer: pointer, Detail: cause, Mend: mend}}
	return r
}

// checkText refuses a text of a body that is too long or holds control
// characters.
func checkText(pointer, text string, least, most int) error {
	if len(text) < least || text != "" && !cleanText(text, most) {
		return wrong(pointer, "it is empty, too long or holds control characters", "give "+strconv.Itoa(least)+" to "+strconv.Itoa(most)+" characters")
	}
	return nil
}

// cleanText reports whether a person's text can be shown and recorded: UTF-8
// of at most so many characters, none of them a control or a line end.
func cleanText(s string, most int) bool {
	if len(s) > 4*most || !utf8.ValidString(s) || utf8.RuneCountInString(s) > most {
		return false
	}
	return !strings.ContainsFunc(s, func(r rune) bool {
		return unicode.IsControl(r) || r == '\u2028' || r == '\u2029' || r == '\uFEFF' || unicode.Is(unicode.Bidi_Control, r)
	})
}

// reply answers with JSON.
func (c *call) reply(status int, doc any) error {
	body, err := json.Marshal(doc)
	if err != nil {
		return err
	}
	return c.send(status, jsonType, body)
}

// send answers with bytes that are whole.
func (c *call) send(status int, mediaType string, body []byte) error {
	h := c.w.Header()
	h.Set("Content-Type", mediaType)
	h.Set("Content-Length", strconv.Itoa(len(body)))
	c.w.WriteHeader(status)
	_, _ = c.w.Write(body) // the client may be gone
	return nil
}
