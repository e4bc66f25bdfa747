package exposure

import (
	"errors"
	"fmt"
	"math"
	"time"

	"beamward/geometry"
)

// Aversion is how long an eye is taken to stay in a visible beam before it
// blinks or turns away (ANSI Z136.1 and IEC 60825-1).
const Aversion = 250 * time.Millisecond

// The exposures answered for. Below a nanosecond and above ten seconds other
// rules hold.
const (
	shortest = time.Nanosecond
	longest  = 10 * time.Second
)

// Edition says whose limits for short pulses are used. They agree on all else
// that is here.
type Edition uint8

const (
	// Strictest takes the lower limit of all the others.
	Strictest Edition = iota
	// Directive2006 is Directive 2006/25/EC, Annex II, as are ANSI Z136.1-2007
	// and IEC 60825-1:2007: 5e-3 J/m² from 1 ns to 18 µs.
	Directive2006
	// Editions2014 is IEC 60825-1:2014, ANSI Z136.1-2014 and ICNIRP 2013: 2e-3
	// J/m² up to 5 µs. Their relief from the correction for many pulses is not
	// taken: Cp = N^-0.25 everywhere. Stated from memory of these texts.
	Editions2014
)

// String returns the edition's name.
func (e Edition) String() string {
	switch e {
	case Strictest:
		return "strictest of the editions"
	case Directive2006:
		return "Directive 2006/25/EC"
	case Editions2014:
		return "IEC 60825-1:2014, ANSI Z136.1-2014"
	}
	return "unknown edition"
}

// single is an edition's limit for one pulse, and the time up to which it holds,
// within which pulses count as one.
type single struct {
	exposure RadiantExposure
	until    float64 // seconds
}

func (e Edition) single() single {
	if e == Directive2006 {
		return single{5e-3, 18e-6}
	}
	return single{2e-3, 5e-6}
}

// thermal returns the limit for one exposure of t seconds: H = 18 t^0.75 J/m²
// for a small source from the end of the single-pulse limit to 10 s (Directive
// 2006/25/EC, Annex II, table 2.2; IEC 60825-1 table A.1; ANSI Z136.1 table 5).
// At a wavelength of 400 to 700 nm the corrections C_A and, for a small source,
// C_E are 1 (the same, table 2.5).
func (s single) thermal(t float64) RadiantExposure {
	if t < s.until {
		return s.exposure
	}
	return RadiantExposure(18 * math.Pow(t, 0.75))
}

// Emission is how a laser shines, and for how long an eye may be in it.
type Emission struct {
	Wavelength geometry.Length
	// Pulse is the length of each pulse, 0 for a continuous beam.
	Pulse time.Duration
	// Repetition is the pulses a second, 0 for a single pulse.
	Repetition float64
	// Exposure is how long an eye is in the beam; 0 is Aversion.
	Exposure time.Duration
	// Edition is whose limits for short pulses to use.
	Edition Edition
}

// Rule is which rule gives a limit.
type Rule uint8

// The rules: the limit of one exposure, and the three for repeated pulses.
const (
	RuleContinuous Rule = iota
	RuleSinglePulse
	RuleAverage
	RuleManyPulses
)

// String returns what the rule says, with its clause.
func (r Rule) String() string {
	switch r {
	case RuleContinuous:
		return "one exposure: 18 t^0.75 J/m² (Directive 2006/25/EC, Annex II, table 2.2)"
	case RuleSinglePulse:
		return "no pulse above the limit of a single pulse (Directive 2006/25/EC, Annex II, table 2.6, rule 1)"
	case RuleAverage:
		return "no group of pulses above the limit of its time (Directive 2006/25/EC, Annex II, table 2.6, rule 2)"
	case RuleManyPulses:
		return "each pulse below the single limit times N^-0.25 (Directive 2006/25/EC, Annex II, table 2.6, rule 3)"
	}
	return "unknown rule"
}

// Limit is a maximum permissible exposure of the eye.
type Limit struct {
	// Irradiance is the limit of a continuous beam, or of the average over the
	// pulses of a repeated one. It is 0 for a single pulse.
	Irradiance Irradiance
	// PerPulse is the limit of each pulse; it is 0 for a continuous beam.
	PerPulse RadiantExposure
	// Exposure is the time for which they hold.
	Exposure time.Duration
	// Pulses is how many pulses were counted, those within the edition's
	// shortest time as one.
	Pulses  int
	Rule    Rule
	Edition Edition
}

// MPE returns the maximum permissible exposure for an emission. It refuses what
// the limits here are not for.
func MPE(e Emission) (Limit, error) {
	if e.Exposure == 0 {
		e.Exposure = Aversion
	}
	switch {
	case !visible(e.Wavelength):
		return Limit{}, refused(e.Wavelength)
	case e.Exposure < shortest || e.Exposure > longest:
		return Limit{}, fmt.Errorf("an exposure of %v is outside the 1 ns to 10 s that the limits here are for", e.Exposure)
	case e.Pulse < 0 || e.Pulse > 0 && e.Pulse < shortest:
		return Limit{}, errors.New("pulses shorter than 1 ns have limits that are not here: ask the laser safety officer")
	case e.Pulse > e.Exposure:
		return Limit{}, fmt.Errorf("a pulse of %v is longer than the exposure of %v: state it as a continuous beam", e.Pulse, e.Exposure)
	case !(e.Repetition >= 0 && !math.IsInf(e.Repetition, 1)):
		return Limit{}, errors.New("the pulses a second must be a number not below 0")
	case e.Repetition > 0 && e.Pulse == 0:
		return Limit{}, errors.New("a repeated pulse needs its length")
	case e.Repetition*e.Pulse.Seconds() >= 1:
		return Limit{}, errors.New("the pulses leave no gap: state the beam as continuous")
	case e.Edition > Editions2014:
		return Limit{}, errors.New("an edition of the limits that is not known")
	}
	if e.Edition != Strictest {
		return limit(e), nil
	}
	e.Edition = Directive2006
	one := limit(e)
	e.Edition = Editions2014
	if other := limit(e); other.PerPulse < one.PerPulse || other.Irradiance < one.Irradiance {
		return other, nil
	}
	return one, nil
}

// limit applies one edition to an emission that it is for.
func limit(e Emission) Limit {
	var (
		s = e.Edition.single()
		t = e.Exposure.Seconds()
		l = Limit{Exposure: e.Exposure, Edition: e.Edition}
	)
	if e.Pulse == 0 {
		l.Irradiance = Irradiance(float64(s.thermal(t)) / t)
		return l
	}
	pulse := e.Pulse.Seconds()
	l.Pulses, l.Rule, l.PerPulse = 1, RuleSinglePulse, s.thermal(pulse)
	if e.Repetition == 0 {
		return l
	}
	lower := func(h RadiantExposure, r Rule) {
		if h < l.PerPulse {
			l.PerPulse, l.Rule = h, r
		}
	}
	n := pulses(t * e.Repetition)
	// Of all groups the longest has the lowest limit a pulse but for the pair,
	// whose time is the shortest for its number.
	lower(s.thermal(t)/RadiantExposure(n), RuleAverage)
	if n >= 2 {
		lower(s.thermal(1/e.Repetition+pulse)/2, RuleAverage)
	}
	// Pulses within the shortest time count as one, of their energies together.
	many := s.thermal(pulse)
	l.Pulses = int(n)
	if e.Repetition*s.until > 1 {
		group := pulses(s.until * e.Repetition)
		many = min(many, s.thermal(s.until)/RadiantExposure(group))
		l.Pulses = int(pulses(t / s.until))
		lower(many, RuleAverage)
	}
	lower(many*RadiantExposure(math.Pow(float64(l.Pulses), -0.25)), RuleManyPulses)
	l.Irradiance = Irradiance(float64(l.PerPulse) * e.Repetition)
	return l
}

// pulses rounds a number of pulses up, but for what floating point adds to a
// whole number.
func pulses(n float64) float64 { return max(1, math.Ceil(n-1e-9*n)) }
