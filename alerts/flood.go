package alerts

import (
	"fmt"
	"time"
)

// A flood begins with more than floodOver alarms within floodWithin and lasts
// until fewer than floodUnder came within it (ISA-18.2, from memory).
const (
	floodWithin = 10 * time.Minute
	floodOver   = 10
	floodUnder  = 5
)

type flood struct {
	on    bool
	times []time.Time // of raises within floodWithin
	held  int         // low alarms that were not sent meanwhile
}

func (f *flood) raised(at time.Time) {
	const most = 1000
	if f.times = append(f.times, at); len(f.times) > most {
		f.times = f.times[1:]
	}
}

// flooded settles whether there is a flood, and tells when one begins and ends.
func (m *Machine) flooded(out *Output) {
	f := &m.flood
	for len(f.times) > 0 && m.at.Sub(f.times[0]) > floodWithin {
		f.times = f.times[1:]
	}
	if f.on {
		for i := range out.Messages {
			if o := &out.Messages[i]; o.What == Raised && o.Priority == Low {
				f.held++
			}
		}
	}
	switch n := len(f.times); {
	case !f.on && n > floodOver:
		f.on, f.held = true, 0
		out.Messages = append(out.Messages, m.words(FloodTold, Medium, "An alarm flood has begun.", fmt.Sprintf("%d alarms in ten minutes; those of low priority are shown and not sent", n)))
	case f.on && n < floodUnder:
		f.on = false
		out.Messages = append(out.Messages, m.words(FloodTold, Medium, "The alarm flood is over.", fmt.Sprintf("%d alarms of low priority were shown and not sent", f.held)))
	}
}
