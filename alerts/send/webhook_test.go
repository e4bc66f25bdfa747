package send

import (
	"context"
	"encoding/base64"
	"encoding/json"
	"errors"
	"io"
	"net/http"
	"net/http/httptest"
	"strconv"
	"strings"
	"testing"
	"time"

	"beamward/alerts"
	"beamward/closures"
)

var evening = time.Date(2031, 2, 14, 20, 0, 0, 0, time.UTC)

func now() time.Time { return evening }

const secret = "whsec_MfKQ9r8GKYqrTwjUPD8ILPZIo2LaLaSw"

func message() *alerts.Message {
	return &alerts.Message{
		ID: "abc-1", At: evening, What: alerts.Raised, Kind: alerts.ShutterFault, Subject: "north", Beams: []closures.BeamID{"north"}, Priority: alerts.High, State: alerts.Unacknowledged,
		Since: evening, Title: `HIGH shutter-fault north: <b>"it"]\ = x`, Detail: "two lines were one", Effect: "light", Do: "stop", Within: 30 * time.Second,
	}
}

// The vector of the open specification's own reference implementations:
// github.com/standard-webhooks/standard-webhooks, libraries v0.0.1,
// go/webhook_test.go, TestWebhookSign.
func TestSignatureVector(t *testing.T) {
	key, err := base64.StdEncoding.DecodeString(strings.TrimPrefix(secret, "whsec_"))
	if err != nil {
		t.Fatal(err)
	}
	got := signature(key, "msg_p5jXN8AQM9LWM0D4loKWxJek", time.Unix(1614265330, 0), []byte(`{"test": 2432232314}`))
	if want := "v1,g0hM9SsE+OTPJTGt/tmIKtSyZlE3uFJELVlNIOLJ1OE="; got != want {
		t.Errorf("%s, want %s", got, want)
	}
}

func TestWebhookSends(t *testing.T) {
	var seen http.Header
	var body []byte
	s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		seen = r.Header
		body, _ = io.ReadAll(r.Body)
		w.WriteHeader(http.StatusNoContent)
	}))
	defer s.Close()
	h, err := NewWebhook(WebhookOptions{URL: s.URL + "/hook", Secret: secret, Now: now})
	if err != nil {
		t.Fatal(err)
	}
	if err := h.Send(context.Background(), message()); err != nil {
		t.Fatal(err)
	}
	if seen.Get("webhook-id") != "abc-1" || seen.Get("webhook-timestamp") != strconv.FormatInt(evening.Unix(), 10) || seen.Get("webhook-signature") != signature(h.key, "abc-1", evening, body) {
		t.Errorf("headers: %v", seen)
	}
	var got struct {
		Type string
		Data map[string]any
	}
	if err := json.Unmarshal(body, &got); err != nil {
		t.Fatal(err)
	}
	if got.Type != "alarm.raised" || got.Data["title"] != message().Title || got.Data["respond_within_s"] != 30.0 || got.Data["state"] != "unacknowledged" {
		t.Errorf("body: %s", body)
	}
	if err := h.Send(context.Background(), &alerts.Message{ID: "n", What: alerts.Notice, Title: "Beam north is open."}); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(string(body), `"type":"notice"`) || strings.Contains(string(body), "state") {
		t.Errorf("notice: %s", body)
	}
}

// What an answer means: taken, to be tried again, or refused for good.
func TestAnswers(t *testing.T) {
	code := 200
	s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if code == 302 {
			w.Header().Set("Location", "/elsewhere")
		}
		if r.URL.Path == "/elsewhere" {
			t.Error("a redirect was followed")
		}
		w.WriteHeader(code)
		_, _ = io.Copy(w, strings.NewReader(strings.Repeat("x", 1<<20))) // more than is read
	}))
	defer s.Close()
	h, err := NewWebhook(WebhookOptions{URL: s.URL + "/secret-path", Secret: secret, Now: now})
	if err != nil {
		t.Fatal(err)
	}
	for c, want := range map[int]string{200: "", 202: "", 302: "final", 307: "final", 400: "final", 401: "again", 404: "again", 408: "again", 410: "final", 413: "final", 429: "again", 500: "again", 503: "again"} {
		code = c
		err := h.Send(context.Background(), message())
		got := ""
		var refused *Refused
		if errors.As(err, &refused) {
			got = "final"
		} else if err != nil {
			got = "again"
		}
		if got != want {
			t.Errorf("%d: %q (%v), want %q", c, got, err, want)
		}
		if err != nil && strings.Contains(err.Error(), "secret") {
			t.Errorf("%d: the error tells the path: %v", c, err)
		}
	}
}

func TestUnreachable(t *testing.T) {
	s := httptest.NewServer(http.HandlerFunc(func(http.ResponseWriter, *http.Request) {}))
	url := s.URL
	s.Close()
	h, err := NewWebhook(WebhookOptions{URL: url + "/secret-path", Secret: secret, Now: now})
	if err != nil {
		t.Fatal(err)
	}
	var refused *Refused
	if err := h.Send(context.Background(), message()); err == nil || errors.As(err, &refused) || strings.Contains(err.Error(), "secret-path") {
		t.Errorf("nobody there: %v", err)
	}
	hang := make(chan struct{})
	s = httptest.NewServer(http.HandlerFunc(func(http.ResponseWriter, *http.Request) { <-hang }))
	defer s.Close()
	defer close(hang)
	h, err = NewWebhook(WebhookOptions{URL: s.URL, Secret: secret, Now: now, Timeout: 50 * time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	if err := h.Send(context.Background(), message()); err == nil {
		t.Error("a receiver that never answers took the message")
	}
}

func TestWebhookRefusals(t *testing.T) {
	good := WebhookOptions{URL: "https://hooks.example/x", Secret: secret, Now: now}
	if _, err := NewWebhook(good); err != nil {
		t.Fatal(err)
	}
	for name, change := range map[string]func(*WebhookOptions){
		"no clock":              func(o *WebhookOptions) { o.Now = nil },
		"no secret":             func(o *WebhookOptions) { o.Secret = "" },
		"a short secret":        func(o *WebhookOptions) { o.Secret = "whsec_c2hvcnQ=" },
		"a secret of no base64": func(o *WebhookOptions) { o.Secret = "whsec_!!!" },
		"plain to a name":       func(o *WebhookOptions) { o.URL = "http://hooks.example/x" },
		"plain to localhost":    func(o *WebhookOptions) { o.URL = "http://localhost/x" },
		"another scheme":        func(o *WebhookOptions) { o.URL = "file:///etc/passwd" },
		"no scheme":             func(o *WebhookOptions) { o.URL = "hooks.example/x" },
		"a user":                func(o *WebhookOptions) { o.URL = "https://user:pw@hooks.example/x" },
		"a fragment":            func(o *WebhookOptions) { o.URL = "https://hooks.example/x#y" },
		"an odd host":           func(o *WebhookOptions) { o.URL = "https://hooks_example%00/x" },
		"a host of controls":    func(o *WebhookOptions) { o.URL = "https://a\r\nb/x" },
		"no host":               func(o *WebhookOptions) { o.URL = "https:///x" },
		"the clouds' metadata":  func(o *WebhookOptions) { o.URL = "http://169.254.169.254/latest" },
		"no address":            func(o *WebhookOptions) { o.URL = "http://0.0.0.0/x" },
		"multicast":             func(o *WebhookOptions) { o.URL = "http://[ff02::1]/x" },
		"a zone":                func(o *WebhookOptions) { o.URL = "http://[fe80::1%25eth0]/x" },
	} {
		o := good
		change(&o)
		if _, err := NewWebhook(o); err == nil {
			t.Errorf("%s: taken", name)
		} else if strings.Contains(err.Error(), "pw") || strings.Contains(err.Error(), secret) {
			t.Errorf("%s: the error tells a secret: %v", name, err)
		}
	}
}
