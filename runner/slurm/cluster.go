package slurm

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"time"

	"rimlight/runner/engine"
	"rimlight/runner/plan"
	"rimlight/runner/store"
)

// A Cluster is a Slurm cluster, as [engine.Elsewhere], for the steps of one run.
type Cluster struct {
	dir     string // of the batches
	store   *store.Store
	host    string
	program plan.KeyText
	o       Options
	limit   int // elements of an array

	mu      sync.Mutex
	where   map[string]string
	batches []*batch // made or taken over by this run
	notes   []string
	logs    map[string]bool // steps whose log was begun

	copying sync.Mutex
	copied  bool
}

// Open gets ready to use the cluster from this machine. The batches go into dir,
// which is made if need be, and which all nodes have to see, as well as the
// store.
func Open(ctx context.Context, dir string, s *store.Store, lib *plan.Library, build plan.Build, o Options) (*Cluster, error) {
	if err := o.Check(); err != nil {
		return nil, err
	}
	c := &Cluster{o: o, store: s, where: map[string]string{}, logs: map[string]bool{}, program: plan.Fingerprint(lib, build)}
	var err error
	if c.dir, err = filepath.Abs(dir); err != nil {
		return nil, err
	}
	c.host, _ = os.Hostname()
	text, err := tool(ctx, "", "scontrol", "show", "config")
	if err != nil {
		return nil, err
	}
	c.limit = parseArrayLimit(text)
	if err := os.MkdirAll(c.dir, 0o777); err != nil {
		return nil, fmt.Errorf("no folder for the cluster's jobs: %w", err)
	}
	return c, nil
}

// Takes reports whether work is worth a place in the queue.
func (c *Cluster) Takes(units int, each time.Duration) bool {
	return c.o.Over == 0 || float64(units)*each.Seconds() >= c.o.Over.Seconds()
}

// Where says which jobs a step is computed by, and why it waits.
func (c *Cluster) Where(step string) string {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.where[step]
}

// setWhere reports whether that is news.
func (c *Cluster) setWhere(step, text string) bool {
	c.mu.Lock()
	defer c.mu.Unlock()
	news := c.where[step] != text
	c.where[step] = text
	return news
}

// Notes are what there is to tell about the jobs of the run.
func (c *Cluster) Notes() []string {
	c.mu.Lock()
	defer c.mu.Unlock()
	return c.notes
}

func (c *Cluster) note(format string, args ...any) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.notes = append(c.notes, fmt.Sprintf(format, args...))
}

// executable is a copy of this program for the nodes, which need not see where
// it lies here.
func (c *Cluster) executable() (string, error) {
	dir := filepath.Join(c.dir, programPrefix+c.program.Key().Short())
	path := filepath.Join(dir, "rimlight")
	c.copying.Lock()
	defer c.copying.Unlock()
	if _, err := os.Stat(path); err == nil && c.copied {
		return path, nil // and no other run has tidied up
	}
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return "", err
	}
	err := copyProgram(path)
	c.copied = err == nil
	return path, err
}

const programPrefix = "program-"

// copyProgram copies the running program to a path. Jobs may be running the file
// that is there: it is replaced, not written to, and only if it is another one.
func copyProgram(to string) error {
	from, err := os.Open("/proc/self/exe")
	if err != nil {
		exe, err := os.Executable()
		if err != nil {
			return err
		}
		if from, err = os.Open(exe); err != nil {
			return err
		}
	}
	defer from.Close()
	if same(from, to) {
		return nil
	}
	if _, err := from.Seek(0, io.SeekStart); err != nil {
		return err
	}
	tmp, err := os.CreateTemp(filepath.Dir(to), ".new-*")
	if err != nil {
		return err
	}
	defer os.Remove(tmp.Name())
	_, err = io.Copy(tmp, from)
	err = errors.Join(err, tmp.Chmod(0o755), tmp.Sync(), tmp.Close())
	if err != nil {
		return err
	}
	return os.Rename(tmp.Name(), to)
}

// same reports whether the file at path has the bytes of r.
func same(r io.Reader, path string) bool {
	f, err := os.Open(path)
	if err != nil {
		return false
	}
	defer f.Close()
	a, b := make([]byte, 1<<20), make([]byte, 1<<20)
	for {
		n, errA := io.ReadFull(r, a)
		m, errB := io.ReadFull(f, b)
		if n != m || string(a[:n]) != string(b[:m]) {
			return false
		}
		if errA != nil || errB != nil {
			return errA == errB
		}
	}
}

// How long to wait, at the end, until jobs have left the queue: before they are
// cancelled, and in all.
const (
	leavingTime   = 3 * time.Second
	cancelledTime = time.Minute
)

// Close waits until the jobs of this run have left the queue, gathers their logs
// into one file per step, and removes the batches. Jobs that stay, which are
// those that an earlier run wanted more of than this one, are cancelled.
func (c *Cluster) Close() {
	ctx := context.Background()
	c.sweep(ctx)
	cancelled := false
	for began := time.Now(); len(c.batches) > 0; time.Sleep(min(c.o.Poll, 200*time.Millisecond)) {
		alive, err := aliveIn(ctx, c.batches)
		var left []*batch
		for _, b := range c.batches {
			if err == nil && !alive[b.jobName()] {
				c.gather(b)
			} else {
				left = append(left, b)
			}
		}
		c.batches = left
		if time.Since(began) > leavingTime && !cancelled {
			cancelled = true
			cancel(ctx, names(left)) // if that fails, they are told of below
		}
		if time.Since(began) > cancelledTime {
			c.note("jobs have not left Slurm's queue: %s; their logs are in %s", strings.Join(names(left), ", "), c.dir)
			return
		}
	}
	c.tidy()
}

// sweep adds to the batches of this run those that nobody attends to and that
// have no jobs in the queue: their parent was killed, and what they computed was
// found in the store.
func (c *Cluster) sweep(ctx context.Context) {
	files, err := filepath.Glob(filepath.Join(c.dir, "*", workName))
	if err != nil {
		return
	}
	var found []*batch
	for _, f := range files {
		if b, err := openBatch(filepath.Dir(f)); err == nil && !c.has(b) && !b.attended(c.host) {
			found = append(found, b)
		}
	}
	alive, err := aliveIn(ctx, found)
	if err != nil {
		return
	}
	for _, b := range found {
		if !alive[b.jobName()] {
			c.keep(b)
		}
	}
}

// names are the names of the jobs of batches.
func names(batches []*batch) []string {
	var out []string
	for _, b := range batches {
		out = append(out, b.jobName())
	}
	return out
}

// aliveIn tells which of the batches, by job name, have jobs in the queue.
func aliveIn(ctx context.Context, batches []*batch) (map[string]bool, error) {
	tasks, err := queue(ctx, names(batches))
	out := map[string]bool{}
	for _, t := range tasks {
		out[t.name] = out[t.name] || t.alive()
	}
	return out, err
}

// gather appends the logs of a batch to the step's, and removes the batch.
func (c *Cluster) gather(b *batch) {
	path := filepath.Join(c.dir, b.logFile())
	how := os.O_APPEND
	if !c.logs[path] {
		how = os.O_TRUNC
	}
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|how, 0o666)
	if err == nil {
		c.logs[path] = true
		err = errors.Join(b.writeLogs(f), f.Close())
	}
	if err != nil {
		c.note("the logs of step %s could not be gathered (%v) and stay in %s", b.work.Step, err, b.dir)
		return
	}
	if err := b.remove(); err != nil {
		c.note("%s could not be removed: %v", b.dir, err)
	}
}

// logFile is the name of the file that the logs of a step are gathered in.
func (b *batch) logFile() string {
	name := b.jobName()
	return strings.TrimPrefix(name[:strings.LastIndexByte(name, '-')], "rimlight-") + ".log"
}

func (b *batch) writeLogs(w io.Writer) error {
	for _, a := range b.arrays {
		for i := range a.count {
			text, err := os.ReadFile(b.path(logName(a.job, i)))
			if errors.Is(err, os.ErrNotExist) || len(text) == 0 {
				continue
			}
			if err != nil {
				return err
			}
			if _, err := fmt.Fprintf(w, "== chunk %d, Slurm job %d_%d\n%s\n", a.first+i, a.job, i, text); err != nil {
				return err
			}
		}
	}
	return nil
}

// tidy removes the copies of the program when there is no batch left that could
// need them.
func (c *Cluster) tidy() {
	if names, err := filepath.Glob(filepath.Join(c.dir, "*", workName)); err != nil || len(names) > 0 {
		return
	}
	names, _ := filepath.Glob(filepath.Join(c.dir, programPrefix+"*"))
	for _, n := range names {
		os.RemoveAll(n)
	}
}

var _ engine.Elsewhere = (*Cluster)(nil)
