//go:build !race

package testkit

// Race says whether the race detector runs.
const Race = false
