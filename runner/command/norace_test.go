//go:build !race

package command

const racing = false
