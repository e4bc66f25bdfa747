package geometry_test

import (
	"fmt"

	"beamward/geometry"

	"github.com/golang/geo/s1"
)

// A box through north, from 30° to 45° high: 5° above its upper edge, and
// inside it less than 1° from its eastern one.
func ExampleBox_Margin() {
	box := geometry.Box{AzFrom: 350 * s1.Degree, AzTo: 10 * s1.Degree, ElFrom: 30 * s1.Degree, ElTo: 45 * s1.Degree}
	above := geometry.FromHorizon(0, 50*s1.Degree)
	fmt.Printf("%+.3f°\n", s1.Angle(box.Margin(above)).Degrees())
	east := geometry.FromHorizon(9*s1.Degree, 38*s1.Degree)
	fmt.Printf("%+.3f°\n", s1.Angle(box.Margin(east)).Degrees())
	// Output:
	// +5.000°
	// -0.788°
}
