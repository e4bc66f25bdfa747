package modes

// Movement is what a surface position states of motion. Numbers that are not
// stated are NaN.
type Movement struct {
	SpeedKt  float64 // the lower end of its step
	StepKt   float64 // how far the step reaches up from it
	Stopped  bool
	TrackDeg float64 // in steps of 2.8°
}

// movementSteps are the steps of the movement field: from each code on, the
// speed in knots and the width of a step.
var movementSteps = [...]struct {
	code     uint32
	from, by float64
}{{2, 0.125, 0.125}, {9, 1, 0.25}, {13, 2, 0.5}, {39, 15, 1}, {94, 70, 2}, {109, 100, 5}, {124, 175, 0}}

// movement reads speed and track of a surface position.
func (m message) movement() Movement {
	v := Movement{SpeedKt: nan, StepKt: nan, TrackDeg: nan}
	code := m.bits(6, 7)
	switch {
	case code == 1:
		v.SpeedKt, v.StepKt, v.Stopped = 0, 0.125, true
	case code >= 2 && code <= 124:
		i := len(movementSteps) - 1
		for movementSteps[i].code > code {
			i--
		}
		s := movementSteps[i]
		v.SpeedKt, v.StepKt = s.from+float64(code-s.code)*s.by, s.by
		if code == 124 {
			v.StepKt = 425 // 175 kt or more
		}
	}
	if m.bit(13) {
		v.TrackDeg = float64(m.bits(14, 7)) * 360 / 128
	}
	return v
}
