package api

import (
	"crypto/sha256"
	"errors"
	"net/http"
	"sync"
	"time"

	"beamward/closures/wire"
)

// answers remembers what was answered to requests with an Idempotency-Key, so
// that one sent again does nothing again. It is bounded: with too many it
// forgets the oldest, and one that it does not remember is done anew.
type answers struct {
	keep time.Duration

	mu    sync.Mutex
	by    map[answerKey]*answered
	order []answerKey // of their coming
	bytes int
}

const (
	answersKept = 10_000
	answerBytes = 32 << 20 // of all together
	maxKey      = 255
)

type answerKey struct{ who, method, path, key string }

type answered struct {
	sum    [sha256.Size]byte // of what was asked
	at     time.Time
	done   chan struct{} // closed once the rest is set
	kept   bool          // the answer stands; else it was not done, and may be tried again
	status int
	header http.Header
	body   []byte
}

// validKey reports whether a key is one to 255 printable characters.
func validKey(key string) bool {
	return key != "" && len(key) <= maxKey && wire.ValidNonce(key[:min(len(key), 128)]) && wire.ValidNonce(key[min(len(key), 128):])
}

// once does something at most once for each key of a client. asked is what was
// asked; lenient says that a key that was used for something else, or is none,
// hinders nothing. Refusals are not remembered.
func (c *call) once(asked []byte, lenient bool, do func() (status int, header http.Header, body []byte, err error)) error {
	all := c.r.Header.Values("Idempotency-Key")
	key := ""
	if len(all) == 1 {
		key = all[0]
	}
	run := func() (*answered, error) {
		status, header, body, err := do()
		return &answered{status: status, header: header, body: body}, err
	}
	switch {
	case len(all) == 0 || lenient && !validKey(key):
		out, err := run()
		if err != nil {
			return err
		}
		return c.answer(out)
	case !validKey(key):
		return badQuery("Idempotency-Key", "it is no key", "give one key of 1 to 255 printable ASCII characters")
	}
	id := answerKey{c.who.Name, c.r.Method, c.r.URL.Path, key}
	sum := sha256.Sum256(asked)
	for {
		old, mine := c.api.answers.find(id, sum)
		if mine {
			return c.first(id, old, run)
		}
		if old.sum != sum {
			if lenient {
				out, err := run()
				if err != nil {
					return err
				}
				return c.answer(out)
			}
			return refuse(http.StatusUnprocessableEntity, "the Idempotency-Key was used for another request", "choose a new key")
		}
		select {
		case <-old.done:
		case <-c.r.Context().Done():
			return c.r.Context().Err()
		}
		if old.kept {
			c.w.Header().Set("Idempotency-Replayed", "true")
			return c.answer(old)
		}
	}
}

// first does what nobody asked for with this key before. Whatever becomes of
// it, those who wait for the answer are let go.
func (c *call) first(id answerKey, one *answered, run func() (*answered, error)) error {
	out, err := (*answered)(nil), errAbandoned
	defer func() { c.api.answers.settle(id, one, out, err) }()
	if out, err = run(); err != nil {
		return err
	}
	return c.answer(out)
}

// errAbandoned stands for the outcome of what did not come to an end.
var errAbandoned = errors.New("it did not come to an end")

func (c *call) answer(a *answered) error {
	for name, values := range a.header {
		c.w.Header()[name] = values
	}
	return c.send(a.status, jsonType, a.body)
}

// find returns what is known of a key. mine says that it is new, and the
// caller's to settle.
func (as *answers) find(id answerKey, sum [sha256.Size]byte) (one *answered, mine bool) {
	now := time.Now()
	as.mu.Lock()
	defer as.mu.Unlock()
	as.forget(now)
	if one := as.by[id]; one != nil {
		return one, false
	}
	one = &answered{sum: sum, at: now, done: make(chan struct{})}
	if as.by == nil {
		as.by = map[answerKey]*answered{}
	}
	as.by[id] = one
	as.order = append(as.order, id)
	return one, true
}

// settle keeps an answer, or forgets the key where there is none.
func (as *answers) settle(id answerKey, one, out *answered, err error) {
	as.mu.Lock()
	defer as.mu.Unlock()
	if err == nil {
		one.status, one.header, one.body, one.kept = out.status, out.header, out.body, true
		as.bytes += len(one.body)
	} else if as.by[id] == one {
		delete(as.by, id)
	}
	close(one.done)
}

// forget drops what is too old or too much. as.mu is held.
func (as *answers) forget(now time.Time) {
	n := 0
	for n < len(as.order) {
		one := as.by[as.order[n]]
		if one != nil && now.Sub(one.at) < as.keep && len(as.order)-n < answersKept && as.bytes <= answerBytes {
			break
		}
		if one != nil {
			as.bytes -= len(one.body)
			delete(as.by, as.order[n])
		}
		n++
	}
	if n > 0 {
		as.order = append(as.order[:0], as.order[n:]...)
	}
}
