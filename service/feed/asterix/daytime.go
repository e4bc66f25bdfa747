package asterix

import (
	"errors"
	"math"
	"time"
)

const day = 86400

var (
	errDaytime  = errors.New("a time of day is past the day's end")
	errFraction = errors.New("a part of a second refers to no whole one")
)

// daytime reads a time of day in steps of 1/128 s. A leap second is the day's
// last.
func daytime(b []byte) (float64, error) {
	s := float64(unsigned(b)) / 128
	if !(s < day+1) {
		return nan, errDaytime
	}
	return s, nil
}

// refine puts a part of a second, in steps of 2⁻³⁰ s, in place of that of a
// time of reception. It says itself whether it belongs to the same whole
// second, the next or the last one.
func refine(at *float64, b []byte) error {
	if b == nil {
		return nil
	}
	v := unsigned(b)
	whole := math.Floor(*at)
	switch v >> 30 {
	case 0:
	case 1:
		whole++
	case 2:
		whole--
	default:
		return errFraction
	}
	if math.IsNaN(whole) {
		return errFraction
	}
	*at = whole + float64(v&(1<<30-1))/(1<<30)
	return nil
}

// place puts a time of day on the day that brings it nearest to the reception.
func place(seconds float64, received time.Time) time.Time {
	received = received.UTC()
	midnight := time.Date(received.Year(), received.Month(), received.Day(), 0, 0, 0, 0, time.UTC)
	at := midnight.Add(time.Duration(math.Round(seconds * 1e9)))
	switch off := at.Sub(received); {
	case off > 12*time.Hour:
		return at.Add(-24 * time.Hour)
	case off < -12*time.Hour:
		return at.Add(24 * time.Hour)
	}
	return at
}

// apart is how far two times of day lie from each other in seconds, across
// midnight too; NaN where one is not stated.
func apart(a, b float64) float64 {
	d := math.Mod(math.Abs(a-b), day)
	return math.Min(d, day-d)
}
