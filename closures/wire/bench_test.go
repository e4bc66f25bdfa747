package wire

import (
	"crypto/ed25519"
	"encoding/json"
	"math"
	"testing"
	"time"

	"beamward/closures"
)

const aircraftLine = `{"kind":"aircraft","source":"rx-1","at":"2031-02-14T03:10:01.512Z","aircraft":"a1b2c3","lat_deg":-31.512345,"lon_deg":-4.012345,"altitude_m":10972.8,"altitude_from":"pressure","speed_mps":231.5,"track_deg":87.25,"climb_mps":-2.54,"error_m":92.6,"vertical_error_m":45,"velocity_error_mps":10,"on_ground":false}`

const aimLine = `{"kind":"aim","beam":"north","at":"2031-02-14T03:10:01.5Z","icrs":{"ra_deg":150.123456,"dec_deg":2.234567},"rate_arcsec_s":{"ra":0.01,"dec":0.02},"error_arcsec":30,"from":"encoder","target":"f-101","motion":"tracking"}`

// bare is what encoding/json decodes beside the parser: no time, no check.
type bare struct {
	Kind          string  `json:"kind"`
	Source        string  `json:"source"`
	At            string  `json:"at"`
	Aircraft      string  `json:"aircraft"`
	Lat           float64 `json:"lat_deg"`
	Lon           float64 `json:"lon_deg"`
	Altitude      float64 `json:"altitude_m"`
	AltitudeFrom  string  `json:"altitude_from"`
	Speed         float64 `json:"speed_mps"`
	Track         float64 `json:"track_deg"`
	Climb         float64 `json:"climb_mps"`
	Error         float64 `json:"error_m"`
	VerticalError float64 `json:"vertical_error_m"`
	VelocityError float64 `json:"velocity_error_mps"`
	OnGround      bool    `json:"on_ground"`
}

// BenchmarkFact reads aircraft facts: budget 100,000 a second for the whole
// intake, and at least half the pace of bare decoding, which runs beside it.
func BenchmarkFact(b *testing.B) {
	line := []byte(aircraftLine)
	p := NewParser(1 << 16)
	if _, _, err := p.Fact(line, received); err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	b.SetBytes(int64(len(line)))
	for b.Loop() {
		_, _, _ = p.Fact(line, received)
	}
	ours, rival := quickest(func() {
		_, _, _ = p.Fact(line, received)
	}, func() {
		var into bare
		_ = json.Unmarshal(line, &into)
	})
	b.ReportMetric(rival, "bare-json-ns/op")
	b.ReportMetric(rival/ours, "x-bare-json")
	b.ReportMetric(1e9/ours, "facts/s")
}

// quickest returns the least nanoseconds of each of two, measured in turns so
// that a busy machine slows both.
func quickest(a, b func()) (ours, rival float64) {
	ours, rival = math.Inf(1), math.Inf(1)
	pace := func(f func()) float64 {
		const n = 200
		start := time.Now()
		for range n {
			f()
		}
		return float64(time.Since(start)) / n
	}
	for range 200 {
		ours, rival = min(ours, pace(a)), min(rival, pace(b))
	}
	return ours, rival
}

func BenchmarkAimFact(b *testing.B) {
	line := []byte(aimLine)
	p := NewParser(1 << 16)
	if _, _, err := p.Fact(line, received); err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		_, _, _ = p.Fact(line, received)
	}
}

func BenchmarkAppendFact(b *testing.B) {
	_, body, err := ParseFact([]byte(aircraftLine), received)
	if err != nil {
		b.Fatal(err)
	}
	var dst []byte
	b.ReportAllocs()
	for b.Loop() {
		dst, _ = AppendFact(dst[:0], body)
	}
}

// BenchmarkRecord writes and reads an aircraft fact in the record's form:
// budget 20,000 a second, admitted, decided and recorded.
func BenchmarkRecord(b *testing.B) {
	name, body, err := ParseFact([]byte(aircraftLine), received)
	if err != nil {
		b.Fatal(err)
	}
	fact := closures.Fact{From: name, Body: body}
	kind, text, err := EncodeBody(nil, fact)
	if err != nil {
		b.Fatal(err)
	}
	b.Run("encode", func(b *testing.B) {
		var dst []byte
		b.ReportAllocs()
		for b.Loop() {
			_, dst, _ = EncodeBody(dst[:0], fact)
		}
		b.ReportMetric(float64(len(text)), "bytes")
	})
	b.Run("decode", func(b *testing.B) {
		b.ReportAllocs()
		for b.Loop() {
			_, _ = DecodeBody(kind, text, Resolver{})
		}
	})
}

// BenchmarkPermit writes a permit beside encoding/json, signs it and verifies it.
func BenchmarkPermit(b *testing.B) {
	p := signed(openPermit())
	key := testKey()
	b.Run("write", func(b *testing.B) {
		var dst []byte
		b.ReportAllocs()
		for b.Loop() {
			dst = AppendPermit(dst[:0], &p)
		}
		type plain Permit
		ours, rival := quickest(func() { dst = AppendPermit(dst[:0], &p) }, func() { _, _ = json.Marshal(plain(p)) })
		b.ReportMetric(rival/ours, "x-encoding/json")
	})
	b.Run("sign", func(b *testing.B) {
		for b.Loop() {
			_ = Sign(PayloadOf(&p), "k1", func(in []byte) []byte { return ed25519.Sign(key, in) })
		}
	})
	b.Run("verify", func(b *testing.B) {
		public := publicKey()
		for b.Loop() {
			if _, err := VerifyPermit(p.Signed, public); err != nil {
				b.Fatal(err)
			}
		}
	})
}
