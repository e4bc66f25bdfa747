package modes

import (
	"testing"
	"time"
)

// frameBudget is how many frames a second must be decoded.
const frameBudget = 200_000

// BenchmarkDecode decodes what a busy sky sends: 500 aircraft near and far, of
// each second's frames two positions, two velocities, and now and then an
// identification, a status, a call and a corrupt frame.
func BenchmarkDecode(b *testing.B) {
	g := random()
	var all []*craft
	for i := range 500 {
		c := near(g)
		c.address = uint32(i)
		if i%5 == 0 {
			c.lat += 3.5
		}
		all = append(all, c)
	}
	type heard struct {
		f  *Frame
		at time.Duration
	}
	var frames []heard
	for s := range 40 {
		for i, c := range all {
			at := time.Duration(s)*500*time.Millisecond + time.Duration(i)*time.Millisecond
			c.fly(0.5)
			frames = append(frames, heard{c.position(), at}, heard{c.motion(), at})
			switch (s + i) % 10 {
			case 0:
				frames = append(frames, heard{squitterOf(df17, c.address, statusMessage(Status{Version: 2, NACp: 9, SIL: 3, GVA: 2})), at})
			case 1:
				frames = append(frames, heard{squitterOf(df17, c.address, message(0).put(1, 5, 4).put(9, 24, 0x041041).put(33, 24, 0x041041)), at})
			case 2, 3:
				frames = append(frames, heard{seal(11<<3|5, byte(c.address>>16), byte(c.address>>8), byte(c.address)), at})
			case 4:
				bad := *c.position()
				bad.b[7] ^= 4
				c.odd = !c.odd
				frames = append(frames, heard{&bad, at})
			}
		}
	}
	d, err := NewDecoder(options())
	if err != nil {
		b.Fatal(err)
	}
	began := time.Date(2031, 2, 14, 3, 0, 0, 0, time.UTC)
	b.ReportAllocs()
	n, reports, start := 0, 0, time.Now()
	for b.Loop() {
		if n > 0 && n%len(frames) == 0 {
			began = began.Add(time.Hour)
		}
		f := &frames[n%len(frames)]
		if _, ok := d.Decode(f.f, began.Add(f.at)); ok {
			reports++
		}
		n++
	}
	b.ReportMetric(float64(n)/time.Since(start).Seconds(), "frames/s")
	b.ReportMetric(frameBudget, "budget-frames/s")
	b.ReportMetric(float64(reports)/float64(n), "reports/frame")
}

func BenchmarkParseLine(b *testing.B) {
	line := []byte("*8D40621D58C382D690C8AC2863A7;")
	b.ReportAllocs()
	for b.Loop() {
		if _, ok, err := ParseLine(line); !ok || err != nil {
			b.Fatal(err)
		}
	}
}
