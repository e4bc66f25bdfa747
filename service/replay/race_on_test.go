//go:build race

package replay_test

// raceOn: the store is many times slower under the race detector.
const raceOn = true
