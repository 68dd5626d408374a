package confine

import "golang.org/x/sys/unix"

const (
	auditArch = unix.AUDIT_ARCH_AARCH64
	x32Bit    = 0
)

// deadlyHere are deadly calls that other architectures lack.
var deadlyHere []uint32
