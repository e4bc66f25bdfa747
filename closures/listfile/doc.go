// Package listfile reads and writes closure lists: the native YAML, JSON and
// CSV forms, and any other text through a layout.
//
// A list with one bad line is refused whole, and every bad line is reported
// with its number, its text, the cause and the mend. Nothing is repaired or
// guessed: a list that was misread could open a beam. What must be mapped is
// mapped outward: a leap second, or a fraction finer than a millisecond, makes
// a closed window longer and an open window or the coverage shorter.
//
// Every list has one canonical form, a JSON text that depends on what the list
// says and not on the format it came in. The digest is taken over it. Angles
// are kept to 1e-12 degree (3.6e-9 arcsec), so that a decimal of degrees
// survives the way into radians and unit vectors and back to the digit.
//
// The package is pure but for reading from and writing to what it is handed;
// nothing here keeps state between calls.
package listfile
