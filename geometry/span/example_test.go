package span_test

import (
	"fmt"
	"math"
	"time"

	"beamward/geometry/span"
)

// When is a target that culminates at midnight below 30°? Its elevation changes
// by no more than the Earth turns, 15° an hour.
func ExampleBelow() {
	midnight := time.Date(2031, 2, 15, 0, 0, 0, 0, time.UTC)
	night := span.Span{From: midnight.Add(-6 * time.Hour), Until: midnight.Add(6 * time.Hour)}
	const turn = 15 * math.Pi / 180 / 3600 // radians a second
	margin := func(at time.Time) float64 {
		elevation := math.Asin(0.8 * math.Cos(turn*at.Sub(midnight).Seconds()))
		return elevation - 30*math.Pi/180
	}
	below := span.Below(margin, turn, night, 100*time.Millisecond)
	for _, s := range below {
		fmt.Println("blocked", s.From.Format(time.TimeOnly), s.Until.Format(time.TimeOnly))
	}
	fmt.Println("allowed", below.Complement(night).Total().Round(time.Second))
	// Output:
	// blocked 18:00:00 20:34:43
	// blocked 03:25:16 06:00:00
	// allowed 6h50m33s
}
