//go:build race

package journal

// thin divides the work of the long loops: SQLite is 4 to 18 times slower
// under the race detector, which looks for other things than they do.
const thin = 8
