package engine

import "time"

// batch is what one turn takes. Its memory goes back by giveBack.
type batch struct {
	people, devices, latest []pending
	more                    bool // something is left
}

// take empties the lanes, up to maxBatch facts. The devices' lane is left alone
// unless it is asked for.
func (in *intake) take(boot time.Duration, devices bool) batch {
	in.mu.Lock()
	defer in.mu.Unlock()
	in.awake.Store(false)
	in.far.due(boot, func(p pending) { _, _ = in.putLatest(p) })
	var b batch
	room := maxBatch
	b.people, in.people = cut(in.people, &room, in.spare[0])
	if devices {
		b.devices, in.devices = cut(in.devices, &room, in.spare[1])
	}
	b.latest, in.latest = cut(in.latest, &room, in.spare[2])
	in.spare = [3][]pending{}
	clear(in.index)
	in.live = 0
	for i := range in.latest {
		if p := &in.latest[i]; !p.gone {
			in.index[p.key] = i
			in.live++
		}
	}
	b.more = len(in.people)+len(in.devices)+in.live > 0
	return b
}

// cut splits a lane where the room ends. What stays is put into spare.
func cut(lane []pending, room *int, spare []pending) (taken, left []pending) {
	n := min(len(lane), *room)
	*room -= n
	left = append(spare[:0], lane[n:]...)
	clear(lane[n:])
	return lane[:n], left
}

// giveBack returns a batch's memory.
func (in *intake) giveBack(b *batch) {
	lanes := [3][]pending{b.people, b.devices, b.latest}
	for i := range lanes {
		clear(lanes[i])
	}
	in.mu.Lock()
	defer in.mu.Unlock()
	in.spare = lanes
}
