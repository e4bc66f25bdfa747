// Package span holds spans of time, sets of them, and the search for the
// times at which a margin may be used up.
//
// A span is half-open: it holds its From and not its Until. A set is sorted
// and its spans neither touch nor overlap, so that two sets that hold the same
// instants are equal. Below and its kin find every instant of a span at which
// a signed margin may be zero or less, from a bound on how fast the margin can
// change; they never miss one.
//
// Everything here is a value or works in its caller's memory; nothing is kept.
// Instants must carry no monotonic reading (see time.Time.Round): a reading
// would decide comparisons that the wall time should.
package span
