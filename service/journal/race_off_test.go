//go:build !race

package journal

const thin = 1
