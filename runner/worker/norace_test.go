//go:build !race

package worker

const racing = false
