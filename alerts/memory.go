package alerts

import (
	"slices"
	"sync"
	"time"
)

// Memory is an Outbox that forgets everything with the process: for a service
// without a store. The zero Memory is ready.
type Memory struct {
	mu   sync.Mutex
	list []Delivery // in the order in which they came; settled ones are gone
	dead []Delivery
}

// mostDead is how many given-up deliveries are kept.
const mostDead = 1000

// Add puts deliveries in. It never errs.
func (m *Memory) Add(ds []Delivery) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	for _, d := range ds {
		if m.at(d.ID) < 0 {
			m.list = append(m.list, d)
		}
	}
	for _, d := range ds {
		of := slices.DeleteFunc(slices.Clone(m.list), func(o Delivery) bool { return o.Receiver != d.Receiver })
		for _, gone := range Overflow(of) {
			m.settle(gone)
		}
	}
	return nil
}

func (m *Memory) at(id string) int {
	return slices.IndexFunc(m.list, func(o Delivery) bool { return o.ID == id })
}

// Due returns what waits for a receiver. It never errs.
func (m *Memory) Due(receiver string, at time.Time, limit int) ([]Delivery, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	var out []Delivery
	for i := range m.list {
		if d := &m.list[i]; len(out) < limit && d.Receiver == receiver && !d.Next.After(at) {
			out = append(out, *d)
		}
	}
	return out, nil
}

// Settle puts a delivery back. It never errs.
func (m *Memory) Settle(d Delivery) error {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.settle(d)
	return nil
}

func (m *Memory) settle(d Delivery) {
	i := m.at(d.ID)
	switch {
	case d.Status == Waiting && i < 0:
		m.list = append(m.list, d)
		m.dead = slices.DeleteFunc(m.dead, func(o Delivery) bool { return o.ID == d.ID })
		return
	case d.Status == Waiting:
		m.list[i] = d
		return
	case i >= 0:
		m.list = slices.Delete(m.list, i, i+1)
	}
	if d.Status == Dead {
		m.dead = append(m.dead, d)
		if len(m.dead) > mostDead {
			m.dead = slices.Delete(m.dead, 0, 1)
		}
	}
}

// Dead returns what was given up, the newest first. It never errs.
func (m *Memory) Dead(limit int) ([]Delivery, error) {
	m.mu.Lock()
	defer m.mu.Unlock()
	out := slices.Clone(m.dead)
	slices.Reverse(out)
	return out[:min(limit, len(out))], nil
}
