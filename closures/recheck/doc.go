// Package recheck is the second opinion on an open decision. It was written
// from the requirements in SAFETY.md and not from the checks: it reads what is
// known, lists, holds and rules, works out again with formulas of its own what
// must shutter, and vetoes where an open decision contradicts that. It can
// never open anything.
//
// It uses the types of package closures and none of its checks, and nothing of
// package geometry. Where the decision's own code works with rotation matrices,
// searches and convex sets, this one uses spherical triangles, haversines, the
// Earth rotation angle, a first-order placing of aircraft, and samples. So one
// mistake is not likely to be made twice.
//
// A false veto shutters a beam for nothing, so that every comparison is made
// with the tolerance that the simpler formula needs, on the side of silence:
// it speaks only where the decision is wrong beyond doubt. Directions turned by
// its own sidereal time count with Unsure, ICRS against ICRS with 1 arcsec,
// instants with 2 ms. It does not look for closures to come further than Ahead,
// beyond any permit. The clock and the record are not among what is known to
// it; slewing, ages, inputs, interlocks, detectors, sightings, watches, the
// shutter, listed windows, coverage, holds, elevation, the Sun, neighbours'
// fields and aircraft are.
//
// A Checker keeps the windows near each beam's aim, so that a look is short
// with many lists. It has one owner. What it answers depends on its arguments
// alone.
package recheck
