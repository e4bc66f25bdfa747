//go:build !race

package replay_test

const raceOn = false
