//go:build unix

package store

import "syscall"

var errInvalid error = syscall.EINVAL
