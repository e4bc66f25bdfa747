package wire

import (
	"strconv"
	"strings"

	"github.com/golang/geo/s1"

	"beamward/closures"
	"beamward/geometry"
)

// pair reads an object of two numbers, both of which must be there.
func (p *Parser) pair(parent, first, second field) *FactError {
	var have fields
	return p.object(parent, func(key []byte) *FactError {
		f := first
		if string(key) == fieldNames[second] {
			f = second
		} else if string(key) != fieldNames[first] {
			return &FactError{Cause: "no field " + quote(key) + " here", Mend: "give " + fieldNames[first] + " and " + fieldNames[second]}
		}
		if have.has(f) {
			return refuse(f, "given twice", "give it once")
		}
		have |= 1 << f
		return p.number(f)
	}, func() *FactError {
		if have != setOf(first, second) {
			return &FactError{Cause: "not whole", Mend: "give " + fieldNames[first] + " and " + fieldNames[second]}
		}
		return nil
	})
}

// object walks an object within a fact. Errors get the parent's name.
func (p *Parser) object(parent field, member func(key []byte) *FactError, end func() *FactError) *FactError {
	s := &p.s
	if !s.take('{') {
		return refuse(parent, "not an object", "give an object")
	}
	within := func(wrong *FactError) *FactError {
		if wrong.Field != "" {
			wrong.Field = "." + wrong.Field
		}
		wrong.Field = fieldNames[parent] + wrong.Field
		return wrong
	}
	s.space()
	for first := true; !s.take('}'); first = false {
		if !first {
			if !s.take(',') {
				return p.syntax("no comma and no end after a value")
			}
			s.space()
		}
		key, wrong := p.key()
		if wrong != nil {
			return wrong
		}
		if wrong := member(key); wrong != nil {
			return within(wrong)
		}
		s.space()
	}
	if wrong := end(); wrong != nil {
		return within(wrong)
	}
	return nil
}

// rate reads the rate of an aim, by equator or by horizon; which of them the
// aim wants is settled when it is whole.
func (p *Parser) rate() *FactError {
	s := p.s
	if s.take('{') {
		s.space()
		if key, _ := s.text(p.scratch[:0]); string(key) == "az" || string(key) == "el" {
			p.azimuth = true
			return p.pair(fRate, fRateAz, fRateEl)
		}
	}
	return p.pair(fRate, fRateRA, fRateDec)
}

// array walks an array within a fact.
func (p *Parser) array(f field, each func(i int) *FactError) *FactError {
	s := &p.s
	if !s.take('[') {
		return refuse(f, "not an array", "give an array")
	}
	s.space()
	for i := 0; !s.take(']'); i++ {
		if i > 0 {
			if !s.take(',') {
				return p.syntax("no comma and no end after an element")
			}
			s.space()
		}
		if wrong := each(i); wrong != nil {
			return wrong
		}
		s.space()
	}
	return nil
}

func (p *Parser) table() *FactError {
	return p.array(fTable, func(i int) *FactError {
		if i >= MaxPoints {
			return refuse(fTable, "more than "+strconv.Itoa(MaxPoints)+" points", "send the part that is needed now")
		}
		point, wrong := p.point()
		if wrong != nil {
			return wrong.at(fTable, i)
		}
		p.points = append(p.points, point)
		return nil
	})
}

func (p *Parser) point() (out closures.AimPoint, wrong *FactError) {
	var have fields
	const whole = 1<<fAt | 1<<fRA | 1<<fDec
	wrong = p.object(fTable, func(key []byte) *FactError {
		f := fAt
		switch string(key) {
		case "at":
		case "ra_deg":
			f = fRA
		case "dec_deg":
			f = fDec
		default:
			return &FactError{Cause: "no field " + quote(key) + " here", Mend: "give at, ra_deg and dec_deg"}
		}
		if have.has(f) {
			return refuse(f, "given twice", "give it once")
		}
		have |= 1 << f
		if f == fAt {
			return p.instant(fAt, &out.At)
		}
		return p.number(f)
	}, func() *FactError {
		if have != whole {
			return &FactError{Cause: "not whole", Mend: "give at, ra_deg and dec_deg"}
		}
		return nil
	})
	if wrong != nil {
		wrong.Field = strings.TrimPrefix(strings.TrimPrefix(wrong.Field, fieldNames[fTable]), ".")
		return out, wrong
	}
	out.Direction = geometry.FromEquator(degrees(p.numbers[fRA-endBools]), degrees(p.numbers[fDec-endBools]))
	return out, nil
}

func degrees(d float64) s1.Angle { return s1.Angle(d) * s1.Degree }

// by reads the people at a post. One person named twice would count as two.
func (p *Parser) by() *FactError {
	p.people = []string{}
	return p.array(fBy, func(i int) *FactError {
		if i >= MaxPeople {
			return refuse(fBy, "more than "+strconv.Itoa(MaxPeople)+" people", "name those who keep the watch")
		}
		b, cause := p.s.text(p.scratch[:0])
		if cause == "" && !validText(b) {
			cause = quote(b) + " is no name of a person"
		}
		if cause != "" {
			return refuseLine(cause, mendText).at(fBy, i)
		}
		for _, other := range p.people {
			if strings.EqualFold(other, string(b)) {
				return refuseLine(quote(b)+" is named twice", "name each person once").at(fBy, i)
			}
		}
		p.people = append(p.people, p.intern(b))
		return nil
	})
}
