package asterix

import "math"

var nan = math.NaN()

// The ages of item 295 in their order.
const (
	ageStatus = iota
	ageTargetDescriptor
	ageMode3A
	ageQuality
	ageIntent
	ageAmplitude
	ageGeometric
	ageFlightLevel
	ageIntermediate
	ageFinal
	ageAirspeed
	ageTrueAirspeed
	ageHeading
	ageBaroRate
	ageGeoRate
	ageVector
	ageTurn
	ageIdentification
	ageTargetStatus
	ageWeather
	ageRoll
	ageAdvisory
	ageSurface
	ageCount
)

// Record is one target report as it states itself. Numbers that are not stated
// are NaN, as are those that the report says are beyond their scale.
type Record struct {
	SAC, SIC uint8 // the station

	Address    uint32
	HasAddress bool
	Track      uint16
	HasTrack   bool

	AddressType    uint8 // ATP
	Ground         bool  // GBS
	Simulated      bool
	Test           bool
	FixedMonitor   bool // RAB
	HasDescription bool // item 040

	LatDeg, LonDeg float64
	StepDeg        float64 // of the position's scale

	// Seconds since midnight, UTC.
	PositionAt         float64 // time of applicability
	VelocityAt         float64
	PositionReceivedAt float64
	VelocityReceivedAt float64
	SentAt             float64

	GeometricFt float64 // above the ellipsoid
	FlightLevel float64 // hundreds of feet by the standard atmosphere

	SpeedKt, TrackDeg float64 // over ground
	BaroFpm, GeoFpm   float64 // climb

	HasQuality bool // item 090
	NACv, NIC  uint8
	HasNACp    bool // its first extent
	SIL, NACp  uint8
	HasGVA     bool // its second extent
	GVA        uint8

	Version    uint8 // of the target's equipment
	HasVersion bool

	Mode3A        uint16 // four octal digits
	Callsign      string
	ServicePeriod float64 // s
	AmplitudeDBm  float64
	Ages          [ageCount]float64 // s
}

func fresh() Record {
	r := Record{LatDeg: nan, LonDeg: nan, PositionAt: nan, VelocityAt: nan, PositionReceivedAt: nan, VelocityReceivedAt: nan, SentAt: nan,
		GeometricFt: nan, FlightLevel: nan, SpeedKt: nan, TrackDeg: nan, BaroFpm: nan, GeoFpm: nan, ServicePeriod: nan, AmplitudeDBm: nan}
	for i := range r.Ages {
		r.Ages[i] = nan
	}
	return r
}

// readRecord reads one record and returns how many octets it takes.
func readRecord(b []byte) (r Record, n int, err error) {
	r = fresh()
	fields := 0
	for more := true; more; n++ {
		switch {
		case n >= len(b):
			return r, 0, errShort
		case n*7 >= len(profile):
			return r, 0, errUnknown
		}
		more = b[n]&1 == 1
		fields++
	}
	var fractions [2][]byte
	items := 0
	for i := range fields * 7 {
		if b[i/7]&(0x80>>(i%7)) == 0 {
			continue
		}
		l := &profile[i]
		m, err := l.measure(b[n:])
		if err != nil {
			return r, 0, err
		}
		data := b[n : n+m]
		switch l.item {
		case 74:
			fractions[0] = data
		case 76:
			fractions[1] = data
		default:
			if err := r.take(l.item, data); err != nil {
				return r, 0, err
			}
		}
		n += m
		items++
	}
	if items == 0 {
		return r, 0, errEmpty
	}
	if err := refine(&r.PositionReceivedAt, fractions[0]); err != nil {
		return r, 0, err
	}
	if err := refine(&r.VelocityReceivedAt, fractions[1]); err != nil {
		return r, 0, err
	}
	return r, n, nil
}

func unsigned(b []byte) uint64 {
	var v uint64
	for _, x := range b {
		v = v<<8 | uint64(x)
	}
	return v
}

func twos(b []byte) int64 {
	shift := 64 - 8*len(b)
	return int64(unsigned(b)<<shift) >> shift
}

// take reads the items that are used.
func (r *Record) take(i item, b []byte) (err error) {
	switch i {
	case 10:
		r.SAC, r.SIC = b[0], b[1]
	case 40:
		r.HasDescription = true
		r.AddressType, r.FixedMonitor = b[0]>>5, b[0]&2 != 0
		if len(b) > 1 {
			r.Ground, r.Simulated, r.Test = b[1]&0x40 != 0, b[1]&0x20 != 0, b[1]&0x10 != 0
		}
	case 161:
		r.Track, r.HasTrack = uint16(unsigned(b))&0xFFF, true
	case 71:
		r.PositionAt, err = daytime(b)
	case 72:
		r.VelocityAt, err = daytime(b)
	case 73:
		r.PositionReceivedAt, err = daytime(b)
	case 75:
		r.VelocityReceivedAt, err = daytime(b)
	case 77:
		r.SentAt, err = daytime(b)
	case 130:
		r.place(b, 180.0/(1<<23))
	case 131:
		r.place(b, 180.0/(1<<30))
	case 80:
		r.Address, r.HasAddress = uint32(unsigned(b)), true
	case 140:
		if v := twos(b); v != 0x7FFF { // else higher than it can say
			r.GeometricFt = 6.25 * float64(v)
		}
	case 90:
		r.quality(b)
	case 210:
		// VNS: the station does not know the version it was sent.
		r.Version, r.HasVersion = b[0]>>3&7, b[0]&0x40 == 0
	case 70:
		r.Mode3A = uint16(unsigned(b)) & 0xFFF
	case 145:
		r.FlightLevel = 0.25 * float64(twos(b))
	case 155:
		r.BaroFpm = rate(b)
	case 157:
		r.GeoFpm = rate(b)
	case 160:
		if v := unsigned(b[:2]); v&0x8000 == 0 { // else faster than it can say
			r.SpeedKt = float64(v) * 3600 / (1 << 14)
			r.TrackDeg = float64(unsigned(b[2:])) * 360 / (1 << 16)
		}
	case 170:
		r.Callsign = callsign(b)
	case 16:
		r.ServicePeriod = 0.5 * float64(b[0])
	case 132:
		r.AmplitudeDBm = float64(int8(b[0]))
	case 295:
		r.ages(b)
	}
	return err
}

// place reads a position. Item 131 comes after item 130, is finer, and takes
// its place.
func (r *Record) place(b []byte, step float64) {
	half := len(b) / 2
	r.LatDeg, r.LonDeg, r.StepDeg = step*float64(twos(b[:half])), step*float64(twos(b[half:])), step
}

func (r *Record) quality(b []byte) {
	r.HasQuality, r.NACv, r.NIC = true, b[0]>>5, b[0]>>1&15
	if len(b) > 1 {
		r.HasNACp, r.SIL, r.NACp = true, b[1]>>5&3, b[1]>>1&15
	}
	if len(b) > 2 {
		r.HasGVA, r.GVA = true, b[2]>>1&3
	}
}

// rate reads a climb rate in feet a minute; NaN: faster than it can say.
func rate(b []byte) float64 {
	v := unsigned(b)
	if v&0x8000 != 0 {
		return nan
	}
	return 6.25 * float64(int16(v<<1)>>1)
}

// letters are the six-bit characters of identifications; # is none.
const letters = "#ABCDEFGHIJKLMNOPQRSTUVWXYZ##### ###############0123456789######"

func callsign(b []byte) string {
	v := unsigned(b)
	var out [8]byte
	for i := range out {
		out[i] = letters[v>>(42-6*i)&63]
	}
	return string(out[:])
}

func (r *Record) ages(b []byte) {
	n := 0
	for b[n]&1 == 1 {
		n++
	}
	at := n + 1
	for i := range ageCount {
		if i/7 <= n && b[i/7]&(0x80>>(i%7)) != 0 {
			r.Ages[i] = 0.1 * float64(b[at])
			at++
		}
	}
}
