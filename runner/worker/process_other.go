//go:build !linux

package worker

import (
	"os"
	"syscall"
)

func executable() (string, error) { return os.Executable() }

func attributes() *syscall.SysProcAttr { return nil }

func killGroup(p *os.Process) error { return p.Kill() }
