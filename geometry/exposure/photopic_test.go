package exposure

import (
	"math"
	"testing"

	"beamward/geometry"
)

func nm(x float64) geometry.Length { return geometry.Length(x * 1e-9) }

// cie holds points of the CIE 1924 photopic luminous efficiency function from
// its 1 nm table, as colour-science/colour has it in
// colorimetry/datasets/lefs.py, "CIE 1924 Photopic Standard Observer" (read
// there).
var cie = []sensitivity{
	{400, 0.000396}, {430, 0.0116}, {445, 0.0298}, {450, 0.0380}, {488, 0.1912735}, {500, 0.3230}, {507, 0.4443096},
	{514, 0.5869653}, {515, 0.6082}, {520, 0.7100}, {530, 0.8620}, {532, 0.8849624}, {540, 0.9540}, {550, 0.9949501},
	{555, 1}, {560, 0.9950}, {570, 0.9520}, {577, 0.8982772}, {580, 0.8700}, {588, 0.7811920}, {589, 0.7691547},
	{590, 0.7570}, {600, 0.6310}, {630, 0.2650}, {633, 0.2353344}, {650, 0.1070}, {700, 0.004102},
}

func TestPhotopicVectors(t *testing.T) {
	for _, c := range cie {
		if got, err := Photopic(nm(c.nanometre)); err != nil || got != c.v {
			t.Errorf("V(%v nm) = %v, %v, want %v", c.nanometre, got, err, c.v)
		}
	}
	// The visual correction factors of a digest of FAA AC 70-1B (secondary): within
	// 0.12 % of V but for the rounding of 0.0004. Its 0.5030 for 600 nm is V(610) and not used.
	for _, c := range []sensitivity{{400, 0.0004}, {450, 0.0380}, {500, 0.3230}, {520, 0.7092}, {555, 1}, {630, 0.2653}, {650, 0.1070}, {700, 0.0041}} {
		if got, _ := Photopic(nm(c.nanometre)); math.Abs(got-c.v) > 0.0012*c.v+5e-6 {
			t.Errorf("V(%v nm) = %v, want about %v", c.nanometre, got, c.v)
		}
	}
	if got, _ := Photopic(nm(610)); got != 0.5030 {
		t.Errorf("V(610 nm) = %v", got)
	}
}

// TestPhotopicSum checks the whole table by the integral of V over 380 to 780
// nm, 106.857 nm in steps of 5 nm (from memory, as are the tails beyond 400 and
// 700 nm, 0.005 of it).
func TestPhotopicSum(t *testing.T) {
	sum := 0.000039 + 0.000064 + 0.00012 + 0.000217 +
		0.002929 + 0.002091 + 0.001484 + 0.001047 + 0.00074 + 0.00052 + 0.000361 + 0.000249 +
		0.000172 + 0.00012 + 0.000085 + 0.00006 + 0.000042 + 0.00003 + 0.000021 + 0.000015
	for _, c := range photopic() {
		if math.Mod(c.nanometre, 5) == 0 {
			sum += c.v
		}
	}
	if got := 5 * sum; math.Abs(got-106.857) > 0.0006 {
		t.Errorf("the integral is %v, want 106.857", got)
	}
}

// TestPhotopicBetween leaves out the points that are not multiples of 5 nm and
// looks what is said there: no less than the true value, and little more.
func TestPhotopicBetween(t *testing.T) {
	var coarse []sensitivity
	for _, c := range photopic() {
		if math.Mod(c.nanometre, 5) == 0 {
			coarse = append(coarse, c)
		}
	}
	for _, c := range cie {
		got := interpolate(coarse, c.nanometre)
		if !(got >= c.v && got <= c.v*1.01) {
			t.Errorf("V(%v nm) = %v between points of 5 nm, want %v to 1 %% above it", c.nanometre, got, c.v)
		}
	}
	for x := 400.0; x <= 700; x += 0.1 {
		got, err := Photopic(nm(x))
		if err != nil || !(got > 0 && got <= 1) {
			t.Fatalf("V(%v nm) = %v, %v", x, got, err)
		}
	}
}

func TestPhotopicRefuses(t *testing.T) {
	for _, x := range []float64{0, -589, 399.99, 700.01, 1064, math.NaN(), math.Inf(1)} {
		if _, err := Photopic(nm(x)); err == nil {
			t.Errorf("%v nm is not refused", x)
		}
	}
}
