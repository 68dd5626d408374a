package confine

import "golang.org/x/sys/unix"

const (
	auditArch = unix.AUDIT_ARCH_X86_64
	x32Bit    = 0x40000000 // marks calls of the x32 interface
)

// deadlyHere are deadly calls that other architectures lack.
var deadlyHere = []uint32{unix.SYS_FORK, unix.SYS_VFORK}
