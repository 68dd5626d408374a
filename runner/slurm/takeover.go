package slurm

import (
	"context"
	"fmt"
	"path/filepath"
	"slices"
	"time"

	"rimlight/runner/store"
)

// takeOver looks for batches that earlier processes have left of this step, takes
// part in what is in the queue and wanted, and cancels what is not wanted.
func (r *round) takeOver(ctx context.Context) error {
	files, err := filepath.Glob(filepath.Join(r.c.dir, "*", workName))
	if err != nil {
		return err
	}
	var found []*batch
	var names []string
	for _, f := range files {
		b, err := openBatch(filepath.Dir(f))
		if err != nil || b.work.Step != r.w.Step || r.c.has(b) {
			continue
		}
		found, names = append(found, b), append(names, b.jobName())
	}
	// Without an answer it is not known what is being computed.
	tasks, err := queue(ctx, names)
	for tries := 0; err != nil; tries++ {
		if tries == patience {
			return err
		}
		select {
		case <-ctx.Done():
			return nil
		case <-time.After(r.c.o.Poll):
		}
		tasks, err = queue(ctx, names)
	}
	wanted := map[store.Key]int{}
	for i, u := range r.w.Units {
		wanted[u.Text.Key()] = i
	}
	for _, b := range found {
		live := b.place(tasks)
		attended := b.attended(r.c.host)
		wants := 0
		for _, t := range live {
			ch, err := b.chunkOf(t, wanted)
			if err != nil {
				continue
			}
			// Of a unit that two chunks have, the first has it.
			for _, u := range ch.units {
				if u >= 0 {
					delete(wanted, r.w.Units[u].Text.Key())
				}
			}
			if ch.wants > 0 {
				r.chunks = append(r.chunks, ch)
			}
			wants += ch.wants
		}
		switch {
		case wants > 0:
			r.c.note("step %s: %d computations were found in %s, submitted by an earlier run", r.w.Step, wants, jobsText(b.jobs()))
		case attended:
			continue
		case len(live) > 0:
			r.c.note("step %s: %s of an earlier run were cancelled, as nothing needs their results now", r.w.Step, jobsText(b.jobs()))
			if err := cancel(ctx, []string{b.jobName()}); err != nil {
				return err
			}
		}
		if b.shared = attended; !attended {
			r.c.keep(b)
		}
	}
	return nil
}

func (c *Cluster) has(b *batch) bool {
	c.mu.Lock()
	defer c.mu.Unlock()
	return slices.ContainsFunc(c.batches, func(k *batch) bool { return k.dir == b.dir })
}

// place gives those tasks that belong to the batch and live. An array whose
// number could not be written down is known by its name.
func (b *batch) place(tasks []task) []task {
	var live []task
	for _, t := range tasks {
		if t.name != b.jobName() || !t.alive() {
			continue
		}
		live = append(live, t)
		if !slices.ContainsFunc(b.arrays, func(a array) bool { return a.job == t.job }) {
			if i := slices.IndexFunc(b.arrays, func(a array) bool { return a.job == 0 }); i >= 0 {
				b.arrays[i].job = t.job
			}
		}
	}
	return live
}

// chunkOf gives the chunk that a task computes, with those of its units that are
// wanted.
func (b *batch) chunkOf(t task, wanted map[store.Key]int) (*chunk, error) {
	for _, a := range b.arrays {
		if a.job != t.job || t.index >= a.count {
			continue
		}
		units, err := b.units(a.first + t.index)
		if err != nil {
			return nil, err
		}
		ch := newChunk(make([]int, len(units)))
		ch.batch, ch.n, ch.job, ch.index, ch.state, ch.node = b, a.first+t.index, t.job, t.index, t.state, t.node
		ch.wants = 0
		for i, u := range units {
			n, ok := wanted[u.Text.Key()]
			if !ok {
				n = -1
			} else {
				ch.wants++
			}
			ch.units[i] = n
		}
		return ch, nil
	}
	return nil, fmt.Errorf("%s has no chunk for job %d_%d", b.dir, t.job, t.index)
}

// jobs are the ids of a batch's arrays.
func (b *batch) jobs() []int {
	var out []int
	for _, a := range b.arrays {
		if a.job != 0 {
			out = append(out, a.job)
		}
	}
	return out
}
