//go:build race

package command

// The race detector takes more memory than tests with a small limit allow.
const racing = true
