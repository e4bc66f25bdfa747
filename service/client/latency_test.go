package client_test

import (
	"context"
	"encoding/json"
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"beamward/closures/wire"
	"beamward/service/client"
)

// From the sending of a fact over HTTP to the changed decision on the stream,
// beside 2,000 other facts a second. Budget: p99 of 10 ms.
func BenchmarkFactToStream(b *testing.B) {
	x := started(b)
	ctx, stop := context.WithCancel(b.Context())
	eve, _ := x.as("eve")
	bus, _ := x.as("bus")
	safe := make(chan bool, 1024)
	done := make(chan struct{})
	go func() {
		defer close(done)
		_ = eve.Stream(ctx, "", func(e client.Event) error {
			var d client.BeamState
			if e.Name == "decision" && json.Unmarshal(e.Data, &d) == nil {
				safe <- !slices.ContainsFunc(d.Reasons, func(r wire.Reason) bool { return r.Code == "interlock" })
			}
			return nil
		})
	}()
	noise := make(chan struct{})
	go func() {
		defer close(noise)
		for tick := time.NewTicker(50 * time.Millisecond); ctx.Err() == nil; <-tick.C {
			now := wire.FormatTime(time.Now())
			line := fmt.Sprintf(`{"kind":"aim","beam":"north","at":%q,"horizon":{"az_deg":150,"el_deg":65},"refracted":false,"error_arcsec":10,"from":"encoder","motion":"fixed"}`+"\n", now)
			_, _ = bus.Facts(ctx, strings.NewReader(strings.Repeat(line, 100)))
		}
	}()
	say := func(yes bool) {
		line := fmt.Sprintf(`{"kind":"interlock","source":"catwalk","at":%q,"safe":%v}`, wire.FormatTime(time.Now()), yes)
		if out, err := bus.Facts(ctx, strings.NewReader(line)); err != nil || out.Accepted != 1 {
			b.Fatalf("%+v %v", out, err)
		}
	}
	say(true)
	for !<-safe {
	}
	var took []time.Duration
	for want := false; b.Loop(); want = !want {
		sent := time.Now()
		say(want)
		for got := !want; got != want; {
			select {
			case got = <-safe:
			case <-time.After(5 * time.Second):
				b.Fatal("the decision does not come")
			}
		}
		took = append(took, time.Since(sent))
	}
	slices.Sort(took)
	b.ReportMetric(float64(took[len(took)/2].Microseconds())/1000, "p50-ms")
	b.ReportMetric(float64(took[len(took)*99/100].Microseconds())/1000, "p99-ms")
	b.Logf("budget: p99 10 ms; %d facts, p99 %v", len(took), took[len(took)*99/100])
	stop()
	<-done
	<-noise
}
