package closures

import "time"

// Durable is what outlives a restart: people's and authorities' words and the
// latches. Knowledge that opens (aims, interlocks that are safe, sources that
// are heard) is never in it.
type Durable struct {
	Lists     []DurableList
	Holds     []HoldPlaced
	Latches   []DurableLatch
	Sightings []Sighted
	Detectors []DetectorSeen
	Tracks    []DurableTrack
}

// DurableList is one list of the book and where it stands.
type DurableList struct {
	List      *List
	By        string
	Confirmed string // who confirmed it; empty when nobody did
	Status    ListStatus
	Asked     string // who asked to withdraw it; empty when nobody did
}

// DurableLatch is what a beam's latch remembers.
type DurableLatch struct {
	Beam        BeamID
	Need        Codes
	ShutterTime time.Duration // the longest measured
}

// DurableTrack is the newest report of an aircraft that still counts.
type DurableTrack struct {
	Seen  AircraftSeen
	Heard time.Time
}
