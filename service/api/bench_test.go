package api

import (
	"bytes"
	"encoding/json"
	"fmt"
	"net/http"
	"net/http/httptest"
	"testing"
	"time"

	"github.com/go-chi/chi/v5"

	"beamward/closures"
	"beamward/service/access"
	"beamward/service/engine"
)

// linesPerBody is a body of about 2 MB.
const linesPerBody = 10_000

// aircraftLines are reports of 500 aircraft, as a receiver sends them.
func aircraftLines() []byte {
	var b bytes.Buffer
	for i := range linesPerBody {
		fmt.Fprintf(&b, `{"kind":"aircraft","source":"rx-1","at":"2031-02-14T00:59:59.%03dZ","aircraft":"a%05x","lat_deg":%.5f,"lon_deg":%.5f,"altitude_m":%d,"altitude_from":"pressure","speed_mps":%.1f,"track_deg":%.1f,"climb_mps":-2.5}`+"\n",
			i%1000, i%500, -31.5+float64(i%500)/1000, -4+float64(i%500)/1000, 9000+i%500, 200+float64(i%50), float64(i%360))
	}
	return b.Bytes()
}

// taker takes every fact and does nothing with it.
type taker struct{ *stage }

func (taker) Offer(closures.Source, closures.Body) (bool, error) { return false, nil }

// intake is the engine's own intake, whose batches nobody takes.
type realIntake struct {
	*stage
	e *engine.Engine
}

func (i realIntake) Offer(from closures.Source, body closures.Body) (bool, error) {
	in, err := i.e.Offer(from, body)
	return in == engine.Superseded, err
}

type noRecord struct{ engine.Record }

func (noRecord) Condition() engine.Condition { return engine.Condition{} }

type benchClock struct{ *stage }

func (benchClock) AfterFunc(time.Duration, func()) func() bool { return func() bool { return true } }

func benchAPI(b *testing.B, s *stage, e Engine) *API {
	b.Helper()
	g, err := access.New(access.Options{})
	if err != nil {
		b.Fatal(err)
	}
	a, err := New(Options{Engine: e, Clock: s, Guard: g, Permits: samePermit(permitBytes()), Limits: Limits{Requests: Rate{1e9, 1e9}, Feeds: Rate{1e9, 1e9}}})
	if err != nil {
		b.Fatal(err)
	}
	return a
}

type samePermit []byte

func (p samePermit) Permit(closures.BeamID, string) ([]byte, error) { return p, nil }
func (p samePermit) Key() []byte                                    { return p }

// permitBytes is as long as a permit is.
func permitBytes() []byte { return bytes.Repeat([]byte("x"), 2500) }

// local makes a request as a process on this machine sends it.
func local(method, path string, body []byte) *http.Request {
	r := httptest.NewRequest(method, path, bytes.NewReader(body))
	r.RemoteAddr, r.Host = "127.0.0.1:50000", "127.0.0.1:8460"
	return r
}

// Aircraft facts through POST /v1/facts, beside bare JSON decoding of the same
// lines. Budget: 100,000 a second, and at least half of the rival.
func BenchmarkFacts(b *testing.B) {
	lines := aircraftLines()
	s := newStage(b)
	e, err := engine.New(engine.Options{Clock: benchClock{s}, Record: noRecord{}, Rules: siteRules(), Boot: closures.Boot{ID: "boot", At: evening}})
	if err != nil {
		b.Fatal(err)
	}
	perSecond := func(b *testing.B) float64 { return float64(linesPerBody) * float64(b.N) / b.Elapsed().Seconds() }
	var handler, rival float64
	for _, c := range []struct {
		name string
		e    Engine
	}{{"handler", taker{s}}, {"handler and intake", realIntake{s, e}}} {
		b.Run(c.name, func(b *testing.B) {
			a := benchAPI(b, s, c.e)
			b.ReportAllocs()
			b.SetBytes(int64(len(lines)))
			for b.Loop() {
				r := local("POST", "/v1/facts", lines)
				r.Header.Set("Content-Type", "application/x-ndjson")
				w := httptest.NewRecorder()
				a.ServeHTTP(w, r)
				if w.Code != 200 || !bytes.Contains(w.Body.Bytes(), []byte(`"accepted":10000,`)) {
					b.Fatalf("%d %s", w.Code, w.Body)
				}
			}
			handler = perSecond(b)
			b.ReportMetric(handler, "facts/s")
		})
	}
	b.Run("encoding/json alone", func(b *testing.B) {
		b.ReportAllocs()
		b.SetBytes(int64(len(lines)))
		for b.Loop() {
			d := json.NewDecoder(bytes.NewReader(lines))
			for range linesPerBody {
				var f struct {
					Kind, Source, Aircraft string
					At                     time.Time
					Lat                    float64 `json:"lat_deg"`
					Lon                    float64 `json:"lon_deg"`
					Altitude               float64 `json:"altitude_m"`
					AltitudeFrom           string  `json:"altitude_from"`
					Speed                  float64 `json:"speed_mps"`
					Track                  float64 `json:"track_deg"`
					Climb                  float64 `json:"climb_mps"`
				}
				if err := d.Decode(&f); err != nil {
					b.Fatal(err)
				}
			}
		}
		rival = perSecond(b)
		b.ReportMetric(rival, "facts/s")
	})
	b.Logf("budget: 100000 facts/s and 0.5 of the rival; reached %.0f facts/s, %.2f of the rival", handler, handler/rival)
}

// A permit through the API, beside a bare router with the same bytes.
func BenchmarkPermit(b *testing.B) {
	s := newStage(b)
	a := benchAPI(b, s, taker{s})
	bare := chi.NewMux()
	bare.Get("/v1/beams/{beam}/permit", func(w http.ResponseWriter, r *http.Request) {
		w.Header().Set("Content-Type", "application/json")
		_, _ = w.Write(permitBytes())
	})
	for _, c := range []struct {
		name string
		h    http.Handler
	}{{"api", a}, {"chi alone", bare}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				w := httptest.NewRecorder()
				c.h.ServeHTTP(w, local("GET", "/v1/beams/north/permit", nil))
				if w.Code != 200 || w.Body.Len() != 2500 {
					b.Fatalf("%d %s", w.Code, w.Body)
				}
			}
		})
	}
}
