//go:build !race

package permit

const hurried = false
