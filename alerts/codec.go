package alerts

import (
	"encoding/json"
	"fmt"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// deliveryForm is how a delivery is kept. Instants are Unix nanoseconds, 0 for
// none.
type deliveryForm struct {
	ID       string      `json:"id"`
	Receiver string      `json:"receiver"`
	Message  messageForm `json:"message"`
	Added    int64       `json:"added"`
	Next     int64       `json:"next"`
	Attempts int         `json:"attempts"`
	Status   string      `json:"status"`
	Why      string      `json:"why"`
}

type messageForm struct {
	ID       string   `json:"id"`
	At       int64    `json:"at"`
	What     string   `json:"what"`
	Kind     string   `json:"kind"`
	Subject  string   `json:"subject"`
	Beams    []string `json:"beams"`
	Priority string   `json:"priority"`
	State    string   `json:"state"`
	Since    int64    `json:"since"`
	Level    int      `json:"level"`
	By       string   `json:"by"`
	Title    string   `json:"title"`
	Detail   string   `json:"detail"`
	Effect   string   `json:"effect"`
	Do       string   `json:"do"`
	Within   int64    `json:"within"`
	Expires  int64    `json:"expires"`
	To       []string `json:"to"`
}

// Encode writes the delivery as JSON, for the store.
func (d *Delivery) Encode() []byte {
	m := &d.Message
	b, err := json.Marshal(&deliveryForm{
		ID: d.ID, Receiver: d.Receiver, Added: stamp(d.Added), Next: stamp(d.Next), Attempts: d.Attempts, Status: d.Status.String(), Why: d.Why,
		Message: messageForm{
			ID: m.ID, At: stamp(m.At), What: m.What.String(), Kind: string(m.Kind), Subject: m.Subject, Priority: m.Priority.String(), State: m.State.String(),
			Beams: each(m.Beams, func(b closures.BeamID) string { return string(b) }), Since: stamp(m.Since), Level: m.Level, By: m.By,
			Title: m.Title, Detail: m.Detail, Effect: m.Effect, Do: m.Do, Within: int64(m.Within), Expires: stamp(m.Expires), To: each(m.To, func(s string) string { return s }),
		},
	})
	if err != nil { // of strings and numbers alone: not reached
		return nil
	}
	return b
}

// DecodeDelivery reads what Encode writes, and nothing else. Texts are cleaned
// again, whatever the store gives back.
func DecodeDelivery(data []byte) (Delivery, error) {
	var f deliveryForm
	if err := wire.Strict(data, &f); err != nil {
		return Delivery{}, fmt.Errorf("reading a delivery: %w", err)
	}
	what, ok1 := ParseWhat(f.Message.What)
	priority, ok2 := ParsePriority(f.Message.Priority)
	state, ok3 := ParseState(f.Message.State)
	status, ok4 := ParseStatus(f.Status)
	if !ok1 || !ok2 || !ok3 || !ok4 || f.ID == "" || f.Receiver == "" {
		return Delivery{}, fmt.Errorf("reading a delivery: %.64q: one of its words is none", f.ID)
	}
	m := &f.Message
	text := func(s string) string { return clean(s, 3*mostDetail) }
	return Delivery{
		ID: f.ID, Receiver: f.Receiver, Added: unstamp(f.Added), Next: unstamp(f.Next), Attempts: f.Attempts, Status: status, Why: text(f.Why),
		Message: Message{
			ID: m.ID, At: unstamp(m.At), What: what, Kind: Kind(m.Kind), Subject: text(m.Subject), Priority: priority, State: state, Since: unstamp(m.Since),
			Beams: each(m.Beams, func(b string) closures.BeamID { return closures.BeamID(b) }), Level: m.Level, By: text(m.By), Title: text(m.Title), Detail: text(m.Detail),
			Effect: text(m.Effect), Do: text(m.Do), Within: time.Duration(m.Within), Expires: unstamp(m.Expires), To: m.To,
		},
	}, nil
}
