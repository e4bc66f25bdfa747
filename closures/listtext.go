package closures

import (
	"time"

	"github.com/golang/geo/r3"
	"github.com/golang/geo/s1"

	"beamward/geometry"
	"beamward/geometry/span"
)

// ListText is what one closure list says, as its reader understood it. Index
// checks it and makes it ready for use; nothing changes it afterwards.
type ListText struct {
	ID           ListID
	Authority    AuthorityID
	Issued       time.Time
	Covers       span.Span
	Replaces     []ListID
	Beams        []BeamID // none: every beam
	UnlistedOpen bool     // what holds outside the regions
	Regions      []Region
	Windows      []Window
	Digest       Digest // over the canonical form
	Lines        []int  // line of each window in the text, where the reader knows; else nil
	Proof        Proof
}

// Proof is what the text proved of its own wholeness.
type Proof struct {
	Digest bool // it carried its digest, and that was right
	Count  bool // it carried its window count, and that was right
}

// Shape is the kind of a region.
type Shape uint8

// The shapes of regions. The zero value is no shape and is refused.
const (
	NoShape Shape = iota
	ICRSCone
	HorizonBox
	TrackCone
	WholeSky
)

// String returns the shape's word, as lists write it.
func (s Shape) String() string {
	switch s {
	case ICRSCone:
		return "icrs"
	case HorizonBox:
		return "horizon"
	case TrackCone:
		return "track"
	case WholeSky:
		return "whole_sky"
	}
	return "none"
}

// Throughout is the standing state of a region without windows.
type Throughout uint8

// The standing states.
const (
	NotThroughout Throughout = iota
	ThroughoutClosed
	ThroughoutOpen
)

// Region is a piece of sky, closed: its edge belongs to it.
type Region struct {
	ID         string
	Shape      Shape
	Direction  r3.Vector    // of an ICRSCone: ICRS unit vector
	Radius     s1.Angle     // of an ICRSCone or a TrackCone
	Box        geometry.Box // of a HorizonBox
	Observed   bool         // a HorizonBox is as seen through the air
	Points     []AimPoint   // of a TrackCone: ICRS, in order of time; it is nowhere outside them
	Throughout Throughout
	Line       int
}

// Window is a span of time over which a region is open or closed.
type Window struct {
	Region int32 // index into ListText.Regions
	Open   bool  // open, and the region is closed outside its open windows; else closed
	From   int64 // Unix nanoseconds
	Until  int64
	Ref    string
}

// Span returns the window's span of time.
func (w Window) Span() span.Span {
	return span.Span{From: time.Unix(0, w.From).UTC(), Until: time.Unix(0, w.Until).UTC()}
}
