// Package render writes closures and plans as tables and calendars for people
// and for the programs that they already have.
//
// What it writes is for information and says so: a calendar is fetched now and
// then and looked at later, and nothing in it opens or closes anything. A span
// that must be written to the second is rounded outward where it closes.
//
// The package reads no clock and keeps no state; the instant of writing is
// given to it, and the same items give the same bytes.
package render
