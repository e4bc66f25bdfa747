package feed

import (
	"sync"
	"time"
)

// noticeEvery is how often operators are told of the same kind of thing.
const noticeEvery = 10 * time.Second

// teller passes notices on, of each text one at once and then at most one
// every noticeEvery, with how many were left out.
type teller struct {
	tell  Notice
	clock Clock

	mu sync.Mutex
	by map[string]*told
}

type told struct {
	at      time.Duration
	leftOut int
}

// notice takes fixed texts only, so that what is kept stays small.
func (t *teller) notice(text string, args ...any) {
	if t.tell == nil {
		return
	}
	now := t.clock.Boot()
	t.mu.Lock()
	if t.by == nil {
		t.by = map[string]*told{}
	}
	last := t.by[text]
	if last != nil && now-last.at < noticeEvery {
		last.leftOut++
		t.mu.Unlock()
		return
	}
	if last == nil {
		last = &told{}
		t.by[text] = last
	} else if last.leftOut > 0 {
		args = append(args, "left_out", last.leftOut)
	}
	last.at, last.leftOut = now, 0
	t.mu.Unlock()
	t.tell(text, args...)
}
