package command

import (
	"os"
	"time"

	"golang.org/x/sys/unix"
)

// lockFolder waits until no other process has the lock of a folder, and takes
// it. Where there are no such locks, as on some network file systems, or if
// somebody keeps it for long, it goes on without.
func lockFolder(dir string) (unlock func()) {
	d, err := os.Open(dir)
	if err != nil {
		return func() {}
	}
	for range 1000 {
		if unix.Flock(int(d.Fd()), unix.LOCK_EX|unix.LOCK_NB) != unix.EWOULDBLOCK {
			break
		}
		time.Sleep(10 * time.Millisecond)
	}
	return func() { d.Close() } // the lock goes with it
}
