package send

import (
	"bytes"
	"context"
	"crypto/hmac"
	"crypto/sha256"
	"crypto/tls"
	"encoding/base64"
	"encoding/json"
	"errors"
	"fmt"
	"net/http"
	"strconv"
	"strings"
	"time"

	"beamward/alerts"
)

// WebhookOptions are what a webhook is made from. URL, Secret and Now are
// needed.
type WebhookOptions struct {
	URL     string
	Secret  string // "whsec_" and base64 of 24 to 64 bytes
	Timeout time.Duration
	TLS     *tls.Config
	Now     func() time.Time
}

// Webhook posts messages as JSON, signed as Standard Webhooks 1.0 says.
type Webhook struct {
	url    string
	client *http.Client
	key    []byte
	now    func() time.Time
}

// NewWebhook makes a webhook, or says what is wrong with its options.
func NewWebhook(o WebhookOptions) (*Webhook, error) {
	if o.Now == nil {
		return nil, errors.New("webhook: no clock is given")
	}
	key, err := base64.StdEncoding.DecodeString(strings.TrimPrefix(o.Secret, "whsec_"))
	if err != nil || len(key) < 24 || len(key) > 64 {
		return nil, errors.New("webhook: the secret cannot be used: give whsec_ and base64 of 24 to 64 random bytes")
	}
	if o.Timeout <= 0 {
		o.Timeout = Timeout
	}
	u, client, err := web(o.URL, o.Timeout, o.TLS)
	if err != nil {
		return nil, fmt.Errorf("webhook: %w", err)
	}
	return &Webhook{url: u.String(), client: client, key: key, now: o.Now}, nil
}

// webhookBody is what is posted.
type webhookBody struct {
	Type string      `json:"type"` // alarm.raised, alarm.returned …, flood, notice
	Time time.Time   `json:"timestamp"`
	Data webhookData `json:"data"`
}

type webhookData struct {
	ID       string     `json:"id"`
	Kind     string     `json:"kind,omitempty"`
	Subject  string     `json:"subject,omitempty"`
	Beams    []string   `json:"beams,omitempty"`
	Priority string     `json:"priority"`
	State    string     `json:"state,omitempty"`
	Since    *time.Time `json:"raised_at,omitempty"`
	Level    int        `json:"escalation"`
	By       string     `json:"by,omitempty"`
	Title    string     `json:"title"`
	Detail   string     `json:"detail,omitempty"`
	Effect   string     `json:"consequence,omitempty"`
	Do       string     `json:"action,omitempty"`
	Within   float64    `json:"respond_within_s,omitempty"`
}

func bodyOf(m *alerts.Message) ([]byte, error) {
	b := webhookBody{Type: m.What.String(), Time: m.At, Data: webhookData{
		ID: m.ID, Kind: string(m.Kind), Subject: m.Subject, Priority: m.Priority.String(), Level: m.Level, By: m.By, Title: m.Title, Detail: m.Detail,
		Effect: m.Effect, Do: m.Do, Within: m.Within.Seconds(),
	}}
	if m.What != alerts.Notice && m.What != alerts.FloodTold {
		b.Type = "alarm." + b.Type
		b.Data.State = m.State.String()
	}
	if !m.Since.IsZero() {
		b.Data.Since = &m.Since
	}
	for _, beam := range m.Beams {
		b.Data.Beams = append(b.Data.Beams, string(beam))
	}
	return json.Marshal(&b)
}

// Send posts one message. The attempt is stamped and signed anew each time; the
// id stays.
func (w *Webhook) Send(ctx context.Context, m *alerts.Message) error {
	body, err := bodyOf(m)
	if err != nil {
		return &Refused{"webhook: the message cannot be written"}
	}
	r, err := http.NewRequestWithContext(ctx, http.MethodPost, w.url, bytes.NewReader(body))
	if err != nil {
		return &Refused{"webhook: the request cannot be made"}
	}
	at := w.now()
	r.Header.Set("Content-Type", "application/json")
	r.Header.Set("User-Agent", "beamward")
	r.Header.Set("webhook-id", m.ID)
	r.Header.Set("webhook-timestamp", strconv.FormatInt(at.Unix(), 10))
	r.Header.Set("webhook-signature", signature(w.key, m.ID, at, body))
	return post(w.client, r)
}

// signature is Standard Webhooks' symmetric one: HMAC-SHA256 over id, seconds
// and body, joined by dots.
func signature(key []byte, id string, at time.Time, body []byte) string {
	h := hmac.New(sha256.New, key)
	_, _ = fmt.Fprintf(h, "%s.%d.", id, at.Unix())
	_, _ = h.Write(body)
	return "v1," + base64.StdEncoding.EncodeToString(h.Sum(nil))
}
