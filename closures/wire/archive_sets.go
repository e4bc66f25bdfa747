package wire

import (
	"beamward/closures"
)

// code carries a reason code, whose zero value is one like the others.
func code(a *archive, key string, p *closures.Code) {
	if !a.field(key, true) {
		if a.reading {
			a.fail("want " + key)
		}
		return
	}
	aCode(a, p)
}

func aCode(a *archive, p *closures.Code) {
	if !a.reading {
		if *p >= closures.NumCodes {
			a.fail("there is no such code: " + p.String())
			return
		}
		a.out = appendString(a.out, p.String())
		return
	}
	b, cause := a.in.text(nil)
	c, ok := closures.ParseCode(string(b))
	switch {
	case cause != "":
		a.fail(cause)
	case !ok:
		a.fail("no such code: " + quote(b))
	}
	*p = c
}

func codes(a *archive, key string, p *closures.Codes) {
	if *p&^closures.AllCodes != 0 {
		a.fail("there is no such code in a set")
	}
	var list []closures.Code
	for c := closures.Code(0); c < closures.NumCodes; c++ {
		if p.Has(c) {
			list = append(list, c)
		}
	}
	many(a, key, &list, aCode)
	*p = 0
	for _, c := range list {
		*p = p.With(c)
	}
}

func digest(a *archive, key string, p *closures.Digest) {
	if !a.field(key, !p.IsZero()) {
		return
	}
	if !a.reading {
		a.out = append(append(append(a.out, '"'), p.String()...), '"')
		return
	}
	b, cause := a.in.text(nil)
	if cause != "" {
		a.fail(cause)
		return
	}
	d, err := closures.ParseDigest(string(b))
	if err != nil {
		a.fail(err.Error())
	}
	*p = d
}

// many carries a slice; an empty one reads back as nil.
func many[T any](a *archive, key string, p *[]T, each func(*archive, *T)) {
	if !a.field(key, len(*p) > 0) {
		return
	}
	a.mark('[')
	if !a.reading {
		for i := range *p {
			if i > 0 {
				a.mark(',')
			}
			each(a, &(*p)[i])
		}
		a.mark(']')
		return
	}
	*p = nil
	for a.err == nil {
		var one T
		each(a, &one)
		*p = append(*p, one)
		if a.in.take(']') {
			return
		}
		a.mark(',')
	}
}

// object carries the fields of a struct that is an element.
func object[T any](a *archive, p *T, fields func(*archive, *T)) {
	a.mark('{')
	if a.err == nil {
		fields(a, p)
	}
	a.mark('}')
}

// nested carries a struct within another, whatever it holds.
func nested[T any](a *archive, key string, p *T, fields func(*archive, *T)) {
	if a.field(key, true) {
		object(a, p, fields)
	}
}

// pointed carries what a pointer points to; nil is left out.
func pointed[T any](a *archive, key string, p **T, fields func(*archive, *T)) {
	if !a.field(key, *p != nil) {
		return
	}
	if a.reading {
		*p = new(T)
	}
	object(a, *p, fields)
}
