// Package asterix decodes EUROCONTROL ASTERIX category 021, reports of ADS-B
// targets by ground stations, into reports of aircraft with hard error bounds.
// It is pure: it reads no clock and does no input or output. A Decoder has one
// owner.
//
// Source: EUROCONTROL-SPEC-0149-12, editions 2.0 to 2.7, whose user
// application profiles are one, through the machine-readable transcription
// zoranbosnjak/asterix-specs (cat-2.7.ast); what is from memory says so.
//
// A data block whose structure is wrong in any place is refused whole: from
// there on nothing in it can be told. Items that are not used are passed over
// by their rules of length; an item that has no rule refuses the block. Blocks
// of other categories are passed over.
//
// Times are seconds of a day that is not stated. They are placed on the day
// that brings them nearest to the reception, so that midnight is crossed
// either way. A report from the future is refused; an old one keeps its own
// time, so that its reach has grown since.
//
// Stated qualities become hard bounds as in Mode S: the larger of the
// containment radius, scaled to a chance of 10⁻⁷ by the integrity level, and
// 2.32 times the 95 % accuracy; what is unknown is replaced by the source's
// own bound. What was measured at another instant than the position has the
// motion in between added; a velocity of unknown age is left out.
package asterix
