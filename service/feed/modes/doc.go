// Package modes decodes Mode S extended squitter, as transponders send it on
// 1090 MHz, into reports of aircraft with hard error bounds. It is pure: it
// reads no clock and does no input or output. A Decoder has one owner.
//
// Sources: J. Sun, The 1090 Megahertz Riddle, 2nd ed. (TU Delft OPEN, 2021),
// for formats, tables and formulas; ICAO Annex 10 vol. IV, Doc 9871 and RTCA
// DO-260B where a comment says so, those from memory.
//
// # What a report rests on
//
// A frame counts only if its parity is right: as sent for DF 17, 18 and 11,
// and as the address of an aircraft that is heard otherwise for the rest. No
// aircraft is reported on the strength of one frame.
//
// A position is sent as the place within a zone, whose number is left out. A
// zone is at least 660 km wide, so that whatever is within 330 km of the site
// is placed rightly from one frame, by the site itself: no mixture of frames
// and no memory can move an aircraft that is near to somewhere else. What is
// farther away would be placed near by that, so a position is reported once a
// frame of the other format agrees with it, or once eight frames of one format
// in a row leave it the only answer. An aircraft farther away needs three
// frames of each format that agree without a break. Until then it is reported
// without a position, for the rules to judge.
//
// # Odd input, each counted (Counts)
//
//   - Wrong parity, an unknown format: nothing is taken from the frame.
//   - A jump that no aircraft could make: the frame waits for another that
//     agrees with it. Then both places count, each with its own memory, and
//     what cannot be told apart (velocity, quality) is left out of the reports
//     of both: two aircraft have one address.
//   - A position sent again to the bit, by an aircraft that moves: an old
//     frame. It makes no report, so that the last one's reach goes on growing.
//   - Altitude missing or in no valid code: the report has none, which the
//     rules take for every height.
//   - A clock that goes back: everything remembered is forgotten.
//
// # Errors
//
// Stated qualities become hard bounds. The larger of the containment radius,
// scaled to a chance of 10⁻⁷ by the integrity level, and 2.32 times the 95 %
// accuracy bounds the position; what is unknown is replaced by the source's
// own bound. What was measured at another instant than the position has the
// motion in between added. Every doubt makes a bound larger, never smaller.
package modes
