package asterix

import (
	"errors"
	"fmt"
	"maps"
	"strconv"
	"time"

	"beamward/closures"
	"beamward/geometry"
	"beamward/geometry/encounter"
)

// Options are what a Decoder is made of.
type Options struct {
	Source  closures.Source
	Edition string          // of the specification, "2.0" to "2.7"
	Geoid   geometry.Length // its height above the ellipsoid at the site
	Motion  encounter.Motion

	// Hard bounds of the errors where a target states none.
	PositionError geometry.Length
	VelocityError geometry.Speed
	ClimbError    geometry.Speed
}

// Counts is what became of the datagrams.
type Counts struct {
	Blocks    uint64 // of category 21
	Other     uint64 // blocks of other categories
	BadBlocks uint64 // refused whole
	Records   uint64
	Located   uint64 // reports with a position
	Unlocated uint64 // reports without
	Drills    uint64 // of them, of simulated or test targets
	Nameless  uint64 // records with neither an address nor a track
	NoTime    uint64 // records with a position and no time
	Ahead     uint64 // records from the future
	Late      uint64 // reports more than a minute old
	BadValue  uint64 // items with a value that cannot be, left out
}

// Decoder makes reports of datagrams. It has one owner.
type Decoder struct {
	options Options
	gva     bool // the edition has the geometric vertical accuracy
	counts  Counts
	records []Record
	names   map[uint32]string
	signs   map[string]string // by name
}

// Editions are those that are read.
var editions = map[string]bool{"2.0": false, "2.1": true, "2.2": true, "2.3": true, "2.4": true, "2.5": true, "2.6": true, "2.7": true}

// NewDecoder makes a decoder.
func NewDecoder(o Options) (*Decoder, error) {
	m := o.Motion
	gva, known := editions[o.Edition]
	switch {
	case !closures.ValidName(string(o.Source)):
		return nil, fmt.Errorf("making an ASTERIX decoder: %.80q is not a source's name", o.Source)
	case !known:
		return nil, fmt.Errorf("making an ASTERIX decoder: edition %.20q of category 021 is not known: state one from 2.0 to 2.7; earlier ones have another profile", o.Edition)
	case !(o.PositionError > 0 && o.VelocityError > 0 && o.ClimbError > 0) || !(m.Speed > 0 && m.Climb > 0 && m.HorizontalAcceleration > 0 && m.VerticalAcceleration > 0) ||
		!geometry.Finite(float64(o.PositionError), float64(o.VelocityError), float64(o.ClimbError), float64(o.Geoid),
			float64(m.Speed), float64(m.Climb), float64(m.HorizontalAcceleration), float64(m.VerticalAcceleration)):
		return nil, errors.New("making an ASTERIX decoder: a bound is missing: state all errors and all bounds on motion")
	}
	return &Decoder{options: o, gva: gva, names: map[uint32]string{}, signs: map[string]string{}}, nil
}

// Counts returns what became of the datagrams so far.
func (d *Decoder) Counts() Counts { return d.counts }

// Callsigns returns the identifications heard, trimmed, by the names of the
// reports' aircraft.
func (d *Decoder) Callsigns() map[string]string { return maps.Clone(d.signs) }

var (
	errHead   = errors.New("its head is cut")
	errLength = errors.New("its length is wrong")
)

// Datagram appends the reports of one datagram, received at the instant given.
// A block that is wrong is refused whole, with a *BlockError; the blocks before
// it count, and those after it unless its length is what is wrong.
func (d *Decoder) Datagram(data []byte, received time.Time, out []closures.AircraftSeen) ([]closures.AircraftSeen, error) {
	var errs []error
	refuse := func(err error) {
		d.counts.BadBlocks++
		errs = append(errs, err)
	}
	for at := 0; at < len(data); {
		rest := data[at:]
		if len(rest) < 3 {
			refuse(&BlockError{Offset: at, Err: errHead})
			break
		}
		n := int(rest[1])<<8 | int(rest[2])
		if n <= 3 || n > len(rest) {
			refuse(&BlockError{Offset: at, Err: errLength})
			break
		}
		if rest[0] != category {
			d.counts.Other++
			at += n
			continue
		}
		d.counts.Blocks++
		records, err := readBlock(rest[3:n], at, d.records[:0])
		if err != nil {
			refuse(err)
		}
		for i := range records {
			d.counts.Records++
			if seen, ok := d.report(&records[i], received); ok {
				out = append(out, seen)
			}
		}
		d.records = records
		at += n
	}
	return out, errors.Join(errs...)
}

// mostNames bounds the names that are remembered.
const mostNames = 1 << 14

// name is how a target is called: its address, marked where it is not an
// aircraft's own; or the station's track.
func (d *Decoder) name(r *Record) (string, bool) {
	key := r.Address&0xFFFFFF | uint32(r.AddressType)<<24
	prefix := ""
	switch {
	case !r.HasAddress && !r.HasTrack:
		return "", false
	case !r.HasAddress:
		return "track-" + strconv.Itoa(int(r.SAC)) + "-" + strconv.Itoa(int(r.SIC)) + "-" + strconv.Itoa(int(r.Track)), true
	case r.AddressType == 1:
		// One address, several targets: only the tracks tell them apart.
		return fmt.Sprintf("dup-%06x-%d", r.Address, r.Track), true
	case r.AddressType == 2:
		prefix = "vehicle-"
	case r.AddressType == 3:
		prefix = "anon-"
	case r.AddressType > 3:
		prefix = "other-"
	}
	if s, ok := d.names[key]; ok {
		return s, true
	}
	if len(d.names) >= mostNames {
		clear(d.names)
		clear(d.signs)
	}
	s := fmt.Sprintf("%s%06x", prefix, r.Address)
	d.names[key] = s
	return s, true
}
