package store

import (
	"os"

	"golang.org/x/sys/unix"
)

// syncAll asks for everything on the file system of a folder to be brought to
// disk. It promises nothing: it makes the syncing of single files quick.
func syncAll(dir string) {
	if d, err := os.Open(dir); err == nil {
		_ = unix.Syncfs(int(d.Fd())) // single files are synced in any case
		d.Close()
	}
}

// free is how many bytes an ordinary user may still write to the disk of a
// folder, and whether that is known.
func free(dir string) (int64, bool) {
	var st unix.Statfs_t
	if err := unix.Statfs(dir, &st); err != nil || st.Blocks == 0 {
		return 0, false
	}
	return int64(st.Bavail) * st.Bsize, true
}
