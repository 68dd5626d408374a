package slurm

import (
	"bufio"
	"bytes"
	"crypto/rand"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"time"

	"rimlight/runner/engine"
	"rimlight/runner/plan"
)

// batchFormat marks the files of a batch. Others are not guessed at.
const batchFormat = "rimlight slurm batch 1"

// A batch is a folder from which chunks are computed.
type batch struct {
	dir    string
	work   workFile
	count  int     // chunks
	arrays []array // submitted
	shared bool    // with another process, which made it and may be alive
}

// workFile is what work.json holds.
type workFile struct {
	Format  string
	Host    string // of the parent
	PID     int
	Program plan.KeyText // what of the parent's program can change results
	Store   string       // folder
	Reserve int64        // of its disk, see [store.Store.Limit]
	Most    int64        // of results in it
	CPUs    int          // workers of a chunk
	engine.Work
}

// An array is a job array, of chunks first to first+count-1 of a batch. Without
// a job id it was about to be submitted.
type array struct{ first, count, job int }

// chunkFile is what chunk-….json holds.
type chunkFile struct{ Units []engine.Unit }

const workName, jobsName = "work.json", "jobs"

func (b *batch) path(name string) string { return filepath.Join(b.dir, name) }

func chunkName(n int) string    { return fmt.Sprintf("chunk-%04d.json", n) }
func progressName(n int) string { return fmt.Sprintf("progress-%04d", n) }

// progressOf is where the process that computes a chunk for the restart'th time
// writes what becomes of it: in a file of its own, in case the one before is not
// as dead as Slurm believes.
func progressOf(n, restart int) string {
	if restart == 0 {
		return progressName(n)
	}
	return progressName(n) + "." + strconv.Itoa(restart)
}

// progressFiles lists the progress files of each chunk, in order.
func (b *batch) progressFiles() map[int][]string {
	entries, err := os.ReadDir(b.dir)
	if err != nil {
		return nil
	}
	out := map[int][]string{}
	for _, e := range entries {
		var n int
		if _, err := fmt.Sscanf(e.Name(), "progress-%d", &n); err == nil {
			out[n] = append(out[n], e.Name())
		}
	}
	return out
}

// jobName is what the jobs of a batch are called.
func (b *batch) jobName() string { return "rimlight-" + filepath.Base(b.dir) }

// newBatch makes a batch, yet without chunks.
func newBatch(dir string, w workFile) (*batch, error) {
	var id [4]byte
	rand.Read(id[:])
	name := strings.Map(func(r rune) rune {
		if r > '~' {
			return 'x'
		}
		return r
	}, w.Step) + "-" + hex.EncodeToString(id[:])
	w.Format, w.PID = batchFormat, os.Getpid()
	// It gets its name when it is a batch.
	b := &batch{dir: filepath.Join(dir, "."+name), work: w}
	if err := os.MkdirAll(b.dir, 0o777); err != nil {
		return nil, err
	}
	if err := b.writeJSON(workName, w); err != nil {
		return nil, err
	}
	made := filepath.Join(dir, name)
	err := os.Rename(b.dir, made)
	b.dir = made
	return b, err
}

// add writes a chunk into the batch and gives its number.
func (b *batch) add(units []engine.Unit) (int, error) {
	n := b.count
	if err := b.writeJSON(chunkName(n), chunkFile{units}); err != nil {
		return 0, err
	}
	// There from the beginning, so that no folder has to be seen to change
	// before the first line can be read.
	if err := os.WriteFile(b.path(progressName(n)), nil, 0o666); err != nil {
		return 0, err
	}
	b.count++
	return n, nil
}

func (b *batch) writeJSON(name string, v any) error {
	data, err := json.Marshal(v)
	if err != nil {
		return err
	}
	tmp := b.path("." + name)
	if err := os.WriteFile(tmp, data, 0o666); err != nil {
		return err
	}
	return os.Rename(tmp, b.path(name))
}

// note appends an array to the file of jobs.
func (b *batch) note(a array) error {
	f, err := os.OpenFile(b.path(jobsName), os.O_WRONLY|os.O_CREATE|os.O_APPEND, 0o666)
	if err != nil {
		return err
	}
	line := fmt.Sprintf("%d %d\n", a.first, a.count)
	if a.job != 0 {
		line = fmt.Sprintf("%d %d %d\n", a.first, a.count, a.job)
	}
	_, err = f.WriteString(line)
	return errors.Join(err, f.Sync(), f.Close())
}

// remove removes the batch. What makes it a batch goes last, so that it is one
// until then, for whoever comes when this process was killed on the way.
func (b *batch) remove() error {
	entries, err := os.ReadDir(b.dir)
	if err != nil {
		return err
	}
	for _, e := range entries {
		if e.Name() != workName {
			err = errors.Join(err, os.Remove(b.path(e.Name())))
		}
	}
	if err != nil {
		return err
	}
	return errors.Join(os.Remove(b.path(workName)), os.Remove(b.dir))
}

// parseJobs reads the file of jobs. An array is known by its first chunk; what
// was written of it last holds. Lines that are not whole are left out.
func parseJobs(text []byte) []array {
	var out []array
	sc := bufio.NewScanner(bytes.NewReader(text))
	for sc.Scan() {
		var f []int
		for _, word := range strings.Fields(sc.Text()) {
			n, err := strconv.Atoi(word)
			if err != nil || n < 0 {
				f = nil
				break
			}
			f = append(f, n)
		}
		if len(f) != 2 && len(f) != 3 || f[1] == 0 || f[1] > maxUnits || f[0] > maxUnits {
			continue
		}
		a := array{first: f[0], count: f[1]}
		if len(f) == 3 {
			a.job = f[2]
		}
		if len(out) > 0 && out[len(out)-1].first == a.first {
			out[len(out)-1] = a
		} else {
			out = append(out, a)
		}
	}
	return out
}

// maxUnits is more than a step may have.
const maxUnits = 1 << 20

// openBatch reads a batch that an earlier process made.
func openBatch(dir string) (*batch, error) {
	b := &batch{dir: dir}
	if err := readJSON(b.path(workName), &b.work); err != nil {
		return nil, err
	}
	if b.work.Format != batchFormat {
		return nil, fmt.Errorf("%s has the format %q, expected %q", b.path(workName), b.work.Format, batchFormat)
	}
	text, err := os.ReadFile(b.path(jobsName))
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return nil, err
	}
	b.arrays = parseJobs(text)
	for ; ; b.count++ {
		if _, err := os.Stat(b.path(chunkName(b.count))); err != nil {
			return b, nil
		}
	}
}

func readJSON(path string, v any) error {
	data, err := os.ReadFile(path)
	if err != nil {
		return err
	}
	if err := json.Unmarshal(data, v); err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	return nil
}

// units reads the units of a chunk.
func (b *batch) units(n int) ([]engine.Unit, error) {
	var c chunkFile
	err := readJSON(b.path(chunkName(n)), &c)
	return c.Units, err
}

// justMade is how long another machine's batch is left alone that has no jobs.
const justMade = 10 * time.Minute

// attended reports whether the process that made a batch may be alive. Of one
// on another machine that can't be known; it is, while the batch is young.
func (b *batch) attended(host string) bool {
	if b.work.Host == host {
		return b.work.PID != os.Getpid() && syscall.Kill(b.work.PID, 0) != syscall.ESRCH
	}
	st, err := os.Stat(b.path(workName))
	return err == nil && time.Since(st.ModTime()) < justMade
}
