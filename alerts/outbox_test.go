package alerts

import (
	"fmt"
	"reflect"
	"strings"
	"testing"
	"time"

	"beamward/closures"
)

func raisedMessage(id string, to ...string) Message {
	return Message{ID: id, At: evening, What: Raised, Kind: DiskLow, Priority: Medium, State: Unacknowledged, Title: "t", Beams: []closures.BeamID{"north"}, To: to}
}

func TestDeliveriesAreRetriedThenGivenUp(t *testing.T) {
	d := Deliveries([]Message{raisedMessage("m", "mail")}, evening)[0]
	at, last := evening, time.Duration(0)
	for d.Status == Waiting {
		d = d.Failed(at, "connection\nrefused", false)
		wait := d.Next.Sub(at)
		if wait < FirstRetry || wait > SlowRetry*5/4 || wait < last && last < SlowRetry {
			t.Fatalf("attempt %d waits %v after %v", d.Attempts, wait, last)
		}
		last, at = wait, d.Next
		if d.Attempts > 1000 {
			t.Fatal("never given up")
		}
	}
	if d.Status != Dead || at.Sub(evening) < 23*time.Hour || d.Why != "connection refused" {
		t.Errorf("given up after %v: %+v", at.Sub(evening), d)
	}
	if d = d.Again(at); d.Status != Waiting || d.Stale(at) {
		t.Errorf("again: %+v", d)
	}
	if d = d.Failed(at, "no such person", true); d.Status != Dead {
		t.Error("a refusal for good is tried again")
	}
	if d = d.Sent(); d.Status != Delivered || d.Why != "" {
		t.Errorf("sent: %+v", d)
	}
	o := raisedMessage("n", "mail")
	o.Expires = evening.Add(time.Minute)
	if d := Deliveries([]Message{o}, evening)[0]; d.Stale(evening) || !d.Stale(evening.Add(time.Minute)) {
		t.Error("expiry is not seen")
	}
}

func TestMemoryOutbox(t *testing.T) {
	var m Memory
	ds := Deliveries([]Message{raisedMessage("1", "mail", "hook"), raisedMessage("2", "mail"), raisedMessage("3")}, evening)
	if len(ds) != 3 {
		t.Fatalf("%d deliveries", len(ds))
	}
	for range 2 {
		if err := m.Add(ds); err != nil {
			t.Fatal(err)
		}
	}
	due := func(receiver string, at time.Time) string {
		got, err := m.Due(receiver, at, 10)
		if err != nil {
			t.Fatal(err)
		}
		return strings.Join(each(got, func(d Delivery) string { return d.ID }), " ")
	}
	if got := due("mail", evening); got != "1.mail 2.mail" {
		t.Errorf("due: %s", got)
	}
	if got := due("mail", evening.Add(-1)); got != "" {
		t.Errorf("due before its time: %s", got)
	}
	_ = m.Settle(ds[0].Failed(evening, "x", false))
	_ = m.Settle(ds[2].Failed(evening, "refused", true))
	if got := due("mail", evening.Add(time.Second)); got != "" {
		t.Errorf("due: %s", got)
	}
	if got := due("mail", evening.Add(time.Minute)); got != "1.mail" {
		t.Errorf("due: %s", got)
	}
	dead, _ := m.Dead(10)
	if len(dead) != 1 || dead[0].ID != "2.mail" || dead[0].Why != "refused" {
		t.Errorf("dead: %+v", dead)
	}
	_ = m.Settle(dead[0].Again(evening))
	if got := due("mail", evening.Add(time.Minute)); got != "1.mail 2.mail" {
		t.Errorf("due: %s", got)
	}
	if dead, _ := m.Dead(10); len(dead) != 0 {
		t.Errorf("dead: %+v", dead)
	}
	_ = m.Settle(ds[1].Sent())
	if got := due("hook", evening.Add(time.Minute)); got != "" {
		t.Errorf("delivered and due: %s", got)
	}
}

// When too much waits, alarms that stand are kept before all else.
func TestOverflowKeepsAlarms(t *testing.T) {
	var m Memory
	var ms []Message
	for i := range MostWaiting + 200 {
		o := raisedMessage(fmt.Sprintf("%04d", i), "mail")
		switch {
		case i < 100:
			o.What = Notice
		case i < 150:
			o.What = CameBack
		}
		ms = append(ms, o)
	}
	_ = m.Add(Deliveries(ms, evening))
	left, _ := m.Due("mail", evening, 5000)
	if len(left) != MostWaiting || left[0].ID != "0200.mail" {
		t.Errorf("%d left, first %s", len(left), left[0].ID)
	}
	dead, _ := m.Dead(5000)
	if len(dead) != 200 || dead[0].Why == "" {
		t.Errorf("%d dead", len(dead))
	}
}

func TestDeliveryCodec(t *testing.T) {
	r := newRoom(t, everyone())
	r.o.Beams[0].Codes = codes(closures.CodeShutterFault)
	r.run(time.Minute)
	for _, d := range Deliveries(r.sent, r.at) {
		d = d.Failed(r.at, "no route", false)
		b := d.Encode()
		got, err := DecodeDelivery(b)
		if err != nil || !reflect.DeepEqual(got, d) {
			t.Fatalf("%v\n%+v\n%+v", err, got, d)
		}
	}
	good := string((&Delivery{ID: "a", Receiver: "b", Message: Message{Title: "x"}}).Encode())
	for _, bad := range []string{"", "{}", good + " 1", strings.Replace(good, `"waiting"`, `"lost"`, 1), strings.Replace(good, `"nothing"`, `"all"`, 1),
		strings.Replace(good, `"none"`, `"urgent"`, 1), strings.Replace(good, `"normal"`, `"odd"`, 1), strings.Replace(good, `"id":"a"`, `"id":""`, 1), strings.Replace(good, `"why"`, `"Why"`, 1)} {
		if _, err := DecodeDelivery([]byte(bad)); err == nil {
			t.Errorf("taken: %s", bad)
		}
	}
}

func FuzzDecodeDelivery(f *testing.F) {
	d := Deliveries([]Message{raisedMessage("m", "mail")}, evening)[0]
	f.Add(d.Encode())
	f.Fuzz(func(t *testing.T, data []byte) {
		d, err := DecodeDelivery(data)
		if err != nil {
			return
		}
		again, err := DecodeDelivery(d.Encode())
		if err != nil || !reflect.DeepEqual(again, d) {
			t.Fatalf("%v\n%+v\n%+v", err, again, d)
		}
	})
}
