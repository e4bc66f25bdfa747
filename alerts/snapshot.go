package alerts

import (
	"encoding/json"
	"fmt"
	"slices"
	"time"

	"beamward/closures"
	"beamward/closures/wire"
)

// snapshotVersion is the number of the form below.
const snapshotVersion = 1

// snapshot is all that a machine must remember over a restart. Instants are
// Unix nanoseconds, 0 for none.
type snapshot struct {
	Version int             `json:"version"`
	At      int64           `json:"at"`
	Seq     uint64          `json:"seq"`
	Working bool            `json:"working"`
	WasOpen bool            `json:"was_open"`
	Alarms  []alarmKept     `json:"alarms"`
	Popups  popupsKept      `json:"popups"`
	Flood   floodKept       `json:"flood"`
	Notices []noticedOfBeam `json:"notices"`
}

type alarmKept struct {
	Kind     string   `json:"kind"`
	Subject  string   `json:"subject"`
	State    string   `json:"state"`
	Raw      bool     `json:"raw"`
	Turned   int64    `json:"turned"`
	Began    int64    `json:"began"`
	Active   bool     `json:"active"`
	Since    int64    `json:"since"`
	Raised   int64    `json:"raised"`
	Count    int      `json:"count"`
	Recent   []int64  `json:"recent"`
	Detail   string   `json:"detail"`
	Beams    []string `json:"beams"`
	By       string   `json:"by"`
	Reason   string   `json:"reason"`
	Until    int64    `json:"until"`
	Parent   string   `json:"parent"`
	Hidden   int64    `json:"hidden"`
	Level    int      `json:"level"`
	Sounding int64    `json:"sounding"`
}

type popupsKept struct {
	Known bool    `json:"known"`
	Count uint64  `json:"count"`
	Times []int64 `json:"times"`
}

type floodKept struct {
	On    bool    `json:"on"`
	Times []int64 `json:"times"`
	Held  int     `json:"held"`
}

type noticedOfBeam struct {
	Beam  string `json:"beam"`
	Open  bool   `json:"open"`
	Told  int64  `json:"told"`
	Until int64  `json:"until"`
	Steps int    `json:"steps"`
	Ended int64  `json:"ended"`
}

func stamp(t time.Time) int64 {
	if t.IsZero() {
		return 0
	}
	return t.UnixNano()
}

func unstamp(n int64) time.Time {
	if n == 0 {
		return time.Time{}
	}
	return time.Unix(0, n).UTC()
}

func each[A, B any](in []A, f func(A) B) []B {
	out := make([]B, len(in))
	for i := range in {
		out[i] = f(in[i])
	}
	return out
}

// Snapshot writes what must outlive a restart, as JSON. The service keeps it
// with the messages that it goes with.
func (m *Machine) Snapshot() []byte {
	s := snapshot{
		Version: snapshotVersion, At: stamp(m.at), Seq: m.seq, Working: m.working, WasOpen: m.wasOpen,
		Popups: popupsKept{m.popups.known, m.popups.count, each(m.popups.times, stamp)},
		Flood:  floodKept{m.flood.on, each(m.flood.times, stamp), m.flood.held},
		Alarms: each(m.alarms, func(a *alarm) alarmKept {
			return alarmKept{
				Kind: string(a.key.Kind), Subject: a.key.Subject, State: a.state.String(), Raw: a.raw, Turned: stamp(a.turned), Began: stamp(a.began), Active: a.active, Since: stamp(a.since),
				Raised: stamp(a.raised), Count: a.count, Recent: each(a.recent, stamp), Detail: a.detail, By: a.by, Reason: a.reason, Until: stamp(a.until),
				Beams:  each(a.beams, func(b closures.BeamID) string { return string(b) }),
				Parent: string(a.parent), Hidden: stamp(a.hidden), Level: a.level, Sounding: stamp(a.sound),
			}
		}),
		Notices: each(m.notices, func(n noticed) noticedOfBeam {
			return noticedOfBeam{string(n.beam), n.open, stamp(n.told), stamp(n.until), n.steps, stamp(n.ended)}
		}),
	}
	b, err := json.Marshal(&s)
	if err != nil { // of strings and numbers alone: not reached
		return nil
	}
	return b
}

// Restored makes a machine of a snapshot. Alarms of kinds that are no longer in
// the table are dropped and named. A snapshot that is not whole is an error: the
// caller then begins with New, and says so, for acknowledgements and shelves
// are lost with it.
//
// What was waiting for its delay when the service stopped waits anew: the
// restart itself may have been the cause.
func Restored(r Routing, data []byte) (*Machine, []Key, error) {
	var s snapshot
	if err := wire.Strict(data, &s); err != nil {
		return nil, nil, fmt.Errorf("reading the snapshot of the alarms: %w", err)
	}
	if s.Version != snapshotVersion {
		return nil, nil, fmt.Errorf("reading the snapshot of the alarms: version %d is not %d", s.Version, snapshotVersion)
	}
	m := &Machine{
		routing: r, at: unstamp(s.At), seq: s.Seq, working: s.Working, wasOpen: s.WasOpen, fresh: true,
		popups: popups{s.Popups.Known, s.Popups.Count, each(s.Popups.Times, unstamp)},
		flood:  flood{s.Flood.On, each(s.Flood.Times, unstamp), s.Flood.Held},
		notices: each(s.Notices, func(n noticedOfBeam) noticed {
			return noticed{closures.BeamID(n.Beam), true, n.Open, unstamp(n.Told), unstamp(n.Until), n.Steps, unstamp(n.Ended)}
		}),
	}
	var dropped []Key
	for i := range s.Alarms {
		k := &s.Alarms[i]
		key := Key{Kind(k.Kind), k.Subject}
		place := rank(key.Kind)
		if place == len(rows) {
			dropped = append(dropped, key)
			continue
		}
		state, ok := ParseState(k.State)
		row := &rows[place]
		if !ok || row.Safety && (state == Shelved || state == OutOfService) || state == Shelved && k.Until == 0 || (row.Scope == OfSite) != (key.Subject == "") || key.Subject != clean(key.Subject, mostName) {
			return nil, nil, fmt.Errorf("reading the snapshot of the alarms: alarm %d, %.64q, cannot be %.32q", i+1, k.Kind, k.State)
		}
		m.alarms = append(m.alarms, &alarm{
			key: key, row: row, state: state, raw: k.Raw, turned: unstamp(k.Turned), began: unstamp(k.Began), active: k.Active, since: unstamp(k.Since), raised: unstamp(k.Raised), count: k.Count,
			recent: each(k.Recent, unstamp), detail: clean(k.Detail, mostDetail), beams: each(k.Beams, func(b string) closures.BeamID { return closures.BeamID(b) }),
			by: clean(k.By, mostName), reason: clean(k.Reason, mostDetail), until: unstamp(k.Until), parent: Kind(k.Parent), hidden: unstamp(k.Hidden), level: max(k.Level, 0), sound: unstamp(k.Sounding),
		})
	}
	slices.SortFunc(m.alarms, func(a, b *alarm) int { return byRank(a.key, b.key) })
	for i := 1; i < len(m.alarms); i++ {
		if m.alarms[i].key == m.alarms[i-1].key {
			return nil, nil, fmt.Errorf("reading the snapshot of the alarms: %.64q is there twice", m.alarms[i].key.Kind)
		}
	}
	return m, dropped, nil
}
