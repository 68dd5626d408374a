package slurm

import (
	"context"
	"fmt"
	"slices"
	"strings"
	"time"

	"rimlight/runner/engine"
)

// A chunk is a part of the work that one job computes.
type chunk struct {
	batch      *batch
	n          int   // its number in the batch
	units      []int // of the round's work; -1 for one that is not wanted, or has ended
	wants      int   // of them, those that have not ended
	job, index int
	state      string    // in the queue, "" when it has left it
	node       string    // that it was last seen on
	gone       time.Time // since when it has not been in the queue
	finished   bool      // it has said that nothing follows
	useful     bool      // some of its units have ended
	tails      map[string]*tail
}

// A round is one call of Do.
type round struct {
	c        *Cluster
	w        engine.Work
	ended    func(unit int, err error)
	moved    func()
	batch    *batch   // of what this round submits
	line     []*chunk // yet to be submitted
	chunks   []*chunk // submitted, here or by an earlier process
	over     []bool   // by unit
	left     int      // units that are not over
	attempts []int    // by unit: jobs that ended without it, and perhaps because of it
	unseen   []unseen // units that are said to be in the store
	refused  int      // times that Slurm has taken no job, since it last did
	waits    string   // why nothing happens
	fault    *engine.Fault
}

// An unseen unit has a record in the store, as its node says, that is yet to be
// seen from here.
type unseen struct {
	chunk *chunk
	index int
	since time.Time
}

// maxAttempts is how many jobs a unit may cost.
const maxAttempts = 3

// graceful is for how many polls results are waited for that a chunk which has
// left the queue may have written: folders that are shared over a network show
// new files late. It is a minute by default.
const graceful = 12

// Do computes work on the cluster. When ctx ends, the jobs are cancelled, and
// what they have finished is told of.
func (c *Cluster) Do(ctx context.Context, w engine.Work, ended func(unit int, err error), moved func()) error {
	r := &round{c: c, w: w, ended: ended, moved: moved, over: make([]bool, len(w.Units)), left: len(w.Units), attempts: make([]int, len(w.Units))}
	if err := r.takeOver(ctx); err != nil {
		return err
	}
	defer r.stop()
	if err := r.plan(); err != nil {
		return err
	}
	asked := time.Time{}
	pause := c.o.Poll / 20
	for r.left > 0 {
		if err := r.submitSome(ctx); err != nil {
			return err
		}
		if time.Since(asked) >= c.o.Poll {
			r.look(ctx)
			asked = time.Now()
		}
		r.read()
		r.see()
		if r.fault != nil {
			return r.fault
		}
		if err := r.replace(); err != nil {
			return err
		}
		r.tell()
		if r.left == 0 {
			break
		}
		select {
		case <-ctx.Done():
			return nil // stop takes it from here
		case <-time.After(pause):
		}
		pause = min(pause+pause/4, c.o.Poll/2, time.Second)
	}
	return nil
}

// plan cuts what nobody computes yet into chunks.
func (r *round) plan() error {
	taken := make([]bool, len(r.w.Units))
	for _, ch := range r.chunks {
		for _, u := range ch.units {
			if u >= 0 {
				taken[u] = true
			}
		}
	}
	var rest []int
	for u := range r.w.Units {
		if !taken[u] && !r.over[u] {
			rest = append(rest, u)
		}
	}
	if len(rest) == 0 {
		return nil
	}
	var chunks []*chunk
	for _, size := range r.c.o.sizes(len(rest), r.w.Each) {
		chunks = append(chunks, newChunk(rest[:size]))
		rest = rest[size:]
	}
	return r.enqueue(chunks)
}

func newChunk(units []int) *chunk {
	return &chunk{units: slices.Clone(units), wants: len(units), tails: map[string]*tail{}}
}

// enqueue describes chunks in the round's batch and puts them in line.
func (r *round) enqueue(chunks []*chunk) error {
	if r.batch == nil {
		w := workFile{Host: r.c.host, Program: r.c.program, Store: r.c.store.Dir(), CPUs: r.c.o.CPUs, Work: r.w}
		w.Reserve, w.Most = r.c.store.Limits()
		b, err := newBatch(r.c.dir, w)
		if err != nil {
			return fmt.Errorf("no jobs can be described in %s: %w", r.c.dir, err)
		}
		r.batch = b
		r.c.keep(b)
	}
	if err := lay(r.batch, r.w.Units, chunks); err != nil {
		return err
	}
	r.line = append(r.line, chunks...)
	return nil
}

// keep remembers a batch, to be tidied up at the end.
func (c *Cluster) keep(b *batch) {
	c.mu.Lock()
	defer c.mu.Unlock()
	c.batches = append(c.batches, b)
}

// names are the names of the jobs that the round has in the queue, or may have.
func (r *round) names() []string {
	var out []string
	for _, ch := range r.chunks {
		if n := ch.batch.jobName(); !slices.Contains(out, n) {
			out = append(out, n)
		}
	}
	return out
}

// alive is how many chunks are in the queue.
func (r *round) alive() int {
	n := 0
	for _, ch := range r.chunks {
		if ch.state != "" {
			n++
		}
	}
	return n
}

// look asks squeue. While it does not answer, nothing is concluded.
func (r *round) look(ctx context.Context) {
	if len(r.chunks) == 0 {
		return
	}
	tasks, err := queue(ctx, r.names())
	if err != nil {
		if ctx.Err() == nil {
			r.waits = err.Error()
		}
		return
	}
	r.waits = ""
	type place struct{ job, index int }
	now := map[place]task{}
	for _, t := range tasks {
		now[place{t.job, t.index}] = t
	}
	reason, running := "", false
	for _, ch := range r.chunks {
		t, ok := now[place{ch.job, ch.index}]
		switch {
		case ok && t.alive():
			ch.state, ch.gone = t.state, time.Time{}
			if t.node != "" {
				ch.node = t.node
			}
			if t.waiting() && t.reason != "" {
				reason = t.reason
			}
			running = running || !t.waiting()
		case ch.gone.IsZero():
			ch.state, ch.gone = "", time.Now()
			if ok { // Slurm holds what it could not start
				tool(ctx, "", "scancel", "--quiet", fmt.Sprintf("%d_%d", ch.job, ch.index))
			}
		}
	}
	if !running && reason != "" {
		r.waits = "waiting: " + reason
	}
}

// fewChunks are so few that all their files can be read all the time, although
// squeue has not said yet that they have begun.
const fewChunks = 64

// read takes up what the chunks have written.
func (r *round) read() {
	written := map[*batch]map[int][]string{}
	for _, ch := range r.chunks {
		if ch.state == "PENDING" && len(ch.tails) == 0 && len(r.chunks) > fewChunks || ch.wants == 0 && ch.finished {
			continue
		}
		if written[ch.batch] == nil {
			written[ch.batch] = ch.batch.progressFiles()
		}
		for _, name := range written[ch.batch][ch.n] {
			if ch.tails[name] == nil {
				ch.tails[name] = &tail{}
			}
			for _, l := range ch.tails[name].next(ch.batch.path(name)) {
				r.take(ch, l)
			}
		}
	}
}

// take takes up one report.
func (r *round) take(ch *chunk, l report) {
	switch {
	case l.End:
		ch.finished = true
	case l.Begin != "":
		ch.finished = false // it was started again
	case l.Refused != nil:
		f := *l.Refused
		if f.Unreadable { // what all have to be computed with
			for i := range ch.units {
				r.end(ch, i, &f)
			}
			return
		}
		f.Text = fmt.Sprintf("Slurm job %d_%d refused the work: %s", ch.job, ch.index, f.Text)
		r.fault = &f
	case l.Unit != nil && *l.Unit < len(ch.units):
		ch.useful = true
		switch {
		case l.Untried:
			r.end(ch, *l.Unit, engine.ErrUntried)
		case l.Fault != nil:
			r.end(ch, *l.Unit, l.Fault)
		default:
			r.unseen = append(r.unseen, unseen{ch, *l.Unit, time.Now()})
		}
	}
}

// see ends the units whose records are there, and those whose records should
// long be there.
func (r *round) see() {
	var still []unseen
	for _, x := range r.unseen {
		u := x.chunk.units[x.index]
		if u < 0 {
			continue
		}
		if _, ok, _ := r.c.store.Record(r.w.Units[u].Text.Key()); ok || time.Since(x.since) > graceful*r.c.o.Poll {
			r.end(x.chunk, x.index, nil)
		} else {
			still = append(still, x)
		}
	}
	r.unseen = still
}

// end ends a unit of a chunk, by its index there.
func (r *round) end(ch *chunk, index int, err error) {
	u := ch.units[index]
	if u < 0 {
		return
	}
	ch.units[index] = -1
	ch.wants--
	if !r.over[u] {
		r.over[u] = true
		r.left--
		r.ended(u, err)
	}
}

// replace puts in line again what was not done by chunks that have left the
// queue, and gives up units that this has happened to too often.
func (r *round) replace() error {
	var again []*chunk
	for _, ch := range r.chunks {
		if ch.wants == 0 || ch.gone.IsZero() || r.waitsFor(ch) || !ch.finished && time.Since(ch.gone) < graceful*r.c.o.Poll {
			continue
		}
		var left []int
		for _, u := range ch.units {
			if u >= 0 {
				left = append(left, u)
			}
		}
		ch.units, ch.wants = nil, 0
		// Units are begun in order, so these may have been the ruin of it; all
		// may, when nothing came of it.
		suspects := min(r.c.o.CPUs, len(left))
		if !ch.useful {
			suspects = len(left)
		}
		var next, last []int
		for i, u := range left {
			if i < suspects {
				r.attempts[u]++
			}
			switch {
			case r.attempts[u] >= maxAttempts:
				r.giveUp(ch, u)
			case i < suspects:
				last = append(last, u)
			default:
				next = append(next, u)
			}
		}
		if next = append(next, last...); len(next) > 0 {
			r.c.note("step %s: Slurm job %d_%d%s ended before its work; %d computations were submitted again%s", r.w.Step, ch.job, ch.index, on(ch.node), len(next), ch.lastWords())
			again = append(again, newChunk(next))
		}
	}
	if len(again) == 0 {
		return nil
	}
	return r.enqueue(again)
}

// waitsFor reports whether a chunk has given results that are yet to be seen.
func (r *round) waitsFor(ch *chunk) bool {
	return slices.ContainsFunc(r.unseen, func(x unseen) bool { return x.chunk == ch })
}

// giveUp ends a unit without a result.
func (r *round) giveUp(ch *chunk, u int) {
	r.over[u] = true
	r.left--
	r.ended(u, &engine.Fault{Fatal: true, Text: fmt.Sprintf("%d Slurm jobs ended before they had computed it, the last one %d_%d%s; raise --slurm-time or --slurm-memory if it took too much of either%s",
		r.attempts[u], ch.job, ch.index, on(ch.node), ch.lastWords())})
}

func on(node string) string {
	if node == "" {
		return ""
	}
	return " on " + node
}

// lastWords is the end of a chunk's log, as a clause.
func (ch *chunk) lastWords() string {
	if text := logTail(ch.batch.path(logName(ch.job, ch.index))); text != "" {
		return "; the end of its log: " + text
	}
	return "; it has left no log: do the nodes see the folder " + ch.batch.dir + "?"
}

// tell says where the work is, if that is news.
func (r *round) tell() {
	var jobs []int
	for _, ch := range r.chunks {
		if ch.wants > 0 && !slices.Contains(jobs, ch.job) {
			jobs = append(jobs, ch.job)
		}
	}
	var parts []string
	if len(jobs) > 0 {
		parts = append(parts, jobsText(jobs))
	}
	if r.waits != "" {
		parts = append(parts, r.waits)
	}
	if r.left > 0 && r.c.setWhere(r.w.Step, strings.Join(parts, ", ")) {
		r.moved()
	}
}

// stop cancels what is still in the queue, and takes up what was finished. What
// another process may wait for as well is left to that.
func (r *round) stop() {
	r.chunks = slices.DeleteFunc(r.chunks, func(ch *chunk) bool { return ch.batch.shared })
	if !slices.ContainsFunc(r.chunks, func(ch *chunk) bool { return ch.wants > 0 }) {
		return // what has no more to do ends by itself
	}
	ctx := context.Background()
	if err := cancel(ctx, r.names()); err != nil {
		r.c.note("step %s: jobs could not be cancelled: %v; cancel %s by hand", r.w.Step, err, strings.Join(r.names(), ", "))
		return
	}
	for began := time.Now(); time.Since(began) < cancelledTime; time.Sleep(min(r.c.o.Poll, 200*time.Millisecond)) {
		if r.look(ctx); r.alive() == 0 {
			break
		}
	}
	r.read()
	r.see()
}
