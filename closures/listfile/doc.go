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
// In the CSV form the head stands in lines "# key: value", with covers as
// from/until and names parted by a comma and a blank; then the header row, and
// one row for each window. The first row that names a region defines it; later
// ones leave the shape columns empty or repeat them exactly. The shapes are
// icrs, horizon, horizon_observed (as seen through the air), track and
// whole_sky. A point of a track is a row whose window is "point", with ra_deg,
// dec_deg and the time in from. A row may define a region and have no window.
// Fields with commas or quotes are quoted, quotes doubled. The last line ends
// like the others.
//
// A track is nowhere outside its points, so a window of a track that reaches
// beyond them is refused: it would lose a closure.
//
// The package is pure but for reading from and writing to what it is handed;
// nothing here keeps state between calls.
package listfile
