//go:build !linux

package clock

import "errors"

// linux stands in where there is no CLOCK_BOOTTIME: it refuses every read, so
// that NewReal refuses to start.
type linux struct{}

var errNotLinux = errors.New("reading CLOCK_BOOTTIME: the service runs on Linux only")

func (linux) boot() (int64, error)    { return 0, errNotLinux }
func (linux) sample() (sample, error) { return sample{}, errNotLinux }
func (linux) discipline() discipline  { return discipline{note: errNotLinux.Error()} }
