package modes

// Counts is what became of the frames.
type Counts struct {
	Frames      uint64
	Proven      uint64 // whose parity was right: reception works
	BadParity   uint64 // of format 17 or 18
	Unproven    uint64 // other formats that no aircraft known otherwise can have sent
	Unused      uint64 // proven, of a type from which nothing is taken
	BadTime     uint64 // frames fed with an instant that cannot be
	ClockBack   uint64 // times at which the clock went back and all was forgotten
	Repeated    uint64 // positions sent again by an aircraft that moves
	Pending     uint64 // positions that waited for another to agree
	Jumps       uint64 // positions where the aircraft could not have come
	Impossible  uint64 // pairs of positions that contradict each other or lie out of range
	Doubled     uint64 // times at which an address proved to be two aircraft's
	NoAltitude  uint64 // positions that state none
	BadAltitude uint64 // positions whose altitude is no valid code
	BadMessage  uint64 // messages with fields that are not defined
	Erratic     uint64 // velocities that no aircraft could have changed to
	Rebroadcast uint64 // frames from the ground: TIS-B and ADS-R
	Located     uint64 // reports with a position
	Unlocated   uint64 // reports without
	Evicted     uint64 // aircraft forgotten to make room
	Aircraft    int    // remembered now
}
