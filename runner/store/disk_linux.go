package store

import (
	"fmt"
	"os"
	"sync"

	"golang.org/x/sys/unix"
)

// syncAll brings everything on the file system of a folder to disk, and reports
// whether it is certain that all of it is there. That takes a file system of
// this machine, whose syncing is known to be complete, and a kernel that tells
// of failed writing (Linux 5.8 and later; an error that nobody has seen is told
// to whoever asks next). Where it is not certain, single files have yet to be
// synced, which is quick then.
func syncAll(dir string) bool {
	d, err := os.Open(dir)
	if err != nil {
		return false
	}
	defer d.Close() // opened for reading: nothing can be lost
	var st unix.Statfs_t
	if err := unix.Syncfs(int(d.Fd())); err != nil || !tellsErrors() || unix.Fstatfs(int(d.Fd()), &st) != nil {
		return false
	}
	switch int64(st.Type) {
	case unix.EXT4_SUPER_MAGIC, unix.XFS_SUPER_MAGIC, unix.BTRFS_SUPER_MAGIC, unix.TMPFS_MAGIC:
		return true
	}
	return false
}

// tellsErrors reports whether the kernel is new enough for syncfs to tell of
// writing that failed.
var tellsErrors = sync.OnceValue(func() bool {
	var u unix.Utsname
	if unix.Uname(&u) != nil {
		return false
	}
	var major, minor int
	if n, _ := fmt.Sscanf(unix.ByteSliceToString(u.Release[:]), "%d.%d", &major, &minor); n != 2 {
		return false
	}
	return major > 5 || major == 5 && minor >= 8
})

// free is how many bytes an ordinary user may still write to the disk of a
// folder, and whether that is known.
func free(dir string) (int64, bool) {
	var st unix.Statfs_t
	if err := unix.Statfs(dir, &st); err != nil || st.Blocks == 0 {
		return 0, false
	}
	return int64(st.Bavail) * st.Bsize, true
}
