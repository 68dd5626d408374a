//go:build race

package worker

// The race detector takes more memory than tests with a small limit allow.
const racing = true
