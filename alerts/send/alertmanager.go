package send

import (
	"bytes"
	"context"
	"crypto/tls"
	"encoding/json"
	"errors"
	"fmt"
	"net/http"
	"strings"
	"time"

	"beamward/alerts"
)

// Hold is for how long an Alertmanager takes an alarm for standing that it is
// not told of again. The service refreshes what stands well within it.
const Hold = 5 * time.Minute

// AlertmanagerOptions are what an Alertmanager receiver is made from. URL and
// Now are needed.
type AlertmanagerOptions struct {
	URL     string // of the Alertmanager, without /api
	Token   string // bearer; empty: none
	Timeout time.Duration
	TLS     *tls.Config
	Now     func() time.Time
}

// Alertmanager tells a Prometheus Alertmanager (API v2) which alarms stand. An
// Alertmanager forgets what it is not told again, so that Refresh must be called
// with what stands, every minute or so; when the service is gone its alarms
// resolve, for which Prometheus needs a rule that minds its absence.
type Alertmanager struct {
	url, token string
	client     *http.Client
	now        func() time.Time
}

// NewAlertmanager makes the receiver, or says what is wrong with its options.
func NewAlertmanager(o AlertmanagerOptions) (*Alertmanager, error) {
	if o.Now == nil {
		return nil, errors.New("alertmanager: no clock is given")
	}
	if strings.ContainsFunc(o.Token, func(r rune) bool { return r <= ' ' || r > '~' }) {
		return nil, errors.New("alertmanager: the token has a character that no header takes")
	}
	if o.Timeout <= 0 {
		o.Timeout = Timeout
	}
	u, client, err := web(o.URL, o.Timeout, o.TLS)
	if err != nil {
		return nil, fmt.Errorf("alertmanager: %w", err)
	}
	return &Alertmanager{url: u.JoinPath("api", "v2", "alerts").String(), token: o.Token, client: client, now: o.Now}, nil
}

// postable is an alert as the API takes it. Its labels are its identity, so
// they never hold what changes.
type postable struct {
	Labels      map[string]string `json:"labels"`
	Annotations map[string]string `json:"annotations"`
	Starts      time.Time         `json:"startsAt"`
	Ends        time.Time         `json:"endsAt"`
}

func alert(k alerts.Kind, subject string, p alerts.Priority, starts, ends time.Time, detail string) postable {
	o := postable{
		Labels:      map[string]string{"alertname": string(k), "service": "beamward", "priority": p.String()},
		Annotations: map[string]string{},
		Starts:      starts, Ends: ends,
	}
	row, _ := alerts.RowOf(k)
	if subject != "" {
		o.Labels[row.Scope.String()] = subject
	}
	for name, text := range map[string]string{"summary": row.Cause, "consequence": row.Consequence, "action": row.Do, "detail": detail} {
		if text != "" {
			o.Annotations[name] = text
		}
	}
	return o
}

// Send tells of one alarm: that it stands, or that it is over. Notices and
// floods are not told.
func (a *Alertmanager) Send(ctx context.Context, m *alerts.Message) error {
	if _, ok := alerts.RowOf(m.Kind); !ok || m.What == alerts.Notice {
		return nil
	}
	ends := m.At
	if m.State == alerts.Unacknowledged || m.State == alerts.Acknowledged {
		ends = a.now().Add(Hold)
	}
	return a.post(ctx, []postable{alert(m.Kind, m.Subject, m.Priority, m.Since, ends, m.Detail)})
}

// Refresh tells again of every alarm that stands.
func (a *Alertmanager) Refresh(ctx context.Context, standing []alerts.Alarm) error {
	if len(standing) == 0 {
		return nil
	}
	ends := a.now().Add(Hold)
	var all []postable
	for i := range standing {
		s := &standing[i]
		all = append(all, alert(s.Kind, s.Subject, s.Row.Priority, s.Raised, ends, s.Detail))
	}
	return a.post(ctx, all)
}

func (a *Alertmanager) post(ctx context.Context, all []postable) error {
	body, err := json.Marshal(all)
	if err != nil {
		return &Refused{"alertmanager: the alerts cannot be written"}
	}
	r, err := http.NewRequestWithContext(ctx, http.MethodPost, a.url, bytes.NewReader(body))
	if err != nil {
		return &Refused{"alertmanager: the request cannot be made"}
	}
	r.Header.Set("Content-Type", "application/json")
	r.Header.Set("User-Agent", "beamward")
	if a.token != "" {
		r.Header.Set("Authorization", "Bearer "+a.token)
	}
	return post(a.client, r)
}
