//go:build race

package permit

// hurried is set where the race detector makes everything ten times slower.
const hurried = true
