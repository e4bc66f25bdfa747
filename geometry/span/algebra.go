package span

import "time"

// Union returns the instants that s or o holds.
func (s Set) Union(o Set) Set { return AppendUnion(nil, s, o) }

// Intersect returns the instants that both s and o hold.
func (s Set) Intersect(o Set) Set { return AppendIntersect(nil, s, o) }

// Subtract returns the instants that s holds and o does not.
func (s Set) Subtract(o Set) Set { return AppendSubtract(nil, s, o) }

// Within returns the instants of s that lie in over.
func (s Set) Within(over Span) Set { return AppendIntersect(nil, s, one(&over)) }

// Complement returns the instants of over that s does not hold.
func (s Set) Complement(over Span) Set { return AppendSubtract(nil, one(&over), s) }

// Widen returns s with each of its spans widened as Span.Widen does.
func (s Set) Widen(lead, tail time.Duration) Set {
	var dst Set
	for _, o := range s {
		dst = dst.put(o.Widen(lead, tail))
	}
	return dst
}

// Narrow returns s with each of its spans narrowed as Span.Narrow does.
func (s Set) Narrow(lead, tail time.Duration) Set {
	var dst Set
	for _, o := range s {
		dst = dst.put(o.Narrow(lead, tail))
	}
	return dst
}

// one returns the set of a single span.
func one(o *Span) Set {
	if o.Empty() {
		return nil
	}
	return Set{*o}
}

// AppendUnion writes over dst with the instants that a or b holds, in its memory
// as far as that goes. Unlike AppendBelow it keeps nothing of what dst holds;
// dst must not share memory with a or b.
func AppendUnion(dst, a, b Set) Set {
	dst = dst[:0]
	for len(a) > 0 || len(b) > 0 {
		if len(b) == 0 || len(a) > 0 && a[0].From.Before(b[0].From) {
			dst, a = dst.put(a[0]), a[1:]
		} else {
			dst, b = dst.put(b[0]), b[1:]
		}
	}
	return dst
}

// AppendIntersect is AppendUnion for the instants that both a and b hold.
func AppendIntersect(dst, a, b Set) Set {
	dst = dst[:0]
	for len(a) > 0 && len(b) > 0 {
		dst = dst.put(a[0].Intersect(b[0]))
		if a[0].Until.Before(b[0].Until) {
			a = a[1:]
		} else {
			b = b[1:]
		}
	}
	return dst
}

// AppendSubtract is AppendUnion for the instants that a holds and b does not.
func AppendSubtract(dst, a, b Set) Set {
	dst = dst[:0]
	for _, left := range a {
		for len(b) > 0 && !b[0].Until.After(left.From) {
			b = b[1:]
		}
		for _, o := range b {
			if !o.From.Before(left.Until) {
				break
			}
			dst = dst.put(Span{left.From, o.From})
			left.From = o.Until
		}
		dst = dst.put(left)
	}
	return dst
}
