package clock

import "time"

// sample is one look at the kernel's clocks, nanoseconds: wall since 1970,
// boot and mono since the machine booted.
type sample struct {
	wall, boot, mono int64
	spread           int64 // the clocks were read within this of each other
}

// discipline is what the kernel says about how its wall clock is kept.
type discipline struct {
	known, synchronised bool
	maxError            time.Duration
	leap                bool
	note                string
}

// kernel is the source that a follower reads. Real has Linux's, Virtual its
// own; neither method keeps state that matters here.
type kernel interface {
	boot() (int64, error) // the cheap read
	sample() (sample, error)
	discipline() discipline
}
