package slurm

import (
	"context"
	"errors"
	"fmt"
	"strconv"
	"strings"

	"rimlight/runner/engine"
)

// submit submits chunks first to first+count-1 of the batch, which have at most
// so many units, as one array. It writes down what it does before and after, so
// that whoever comes next knows of every job.
func (c *Cluster) submit(ctx context.Context, b *batch, first, count, units int) (array, error) {
	a := array{first: first, count: count}
	if err := b.note(a); err != nil {
		return a, err
	}
	program, err := c.executable()
	if err != nil {
		return a, fmt.Errorf("the program could not be copied for the nodes: %w", err)
	}
	args := []string{"--parsable", "--requeue", "--job-name=" + b.jobName(), "--chdir=" + b.dir, "--open-mode=append"}
	if c.limit > 0 {
		args = append(args, fmt.Sprintf("--array=0-%d", count-1), "--output="+b.path("log-%A_%a.txt"))
	} else {
		args = append(args, "--output="+b.path("log-%j_0.txt"))
	}
	args = append(args, c.o.request(units, b.work.Each, b.work.Limits)...)
	// The job is not to be stopped by Ctrl-C before its number is known.
	out, err := tool(context.WithoutCancel(ctx), script(program, b.dir, first), "sbatch", args...)
	if err != nil {
		return a, err
	}
	if a.job, err = parseJob(out); err != nil {
		return a, err
	}
	return a, b.note(a)
}

// script is what Slurm starts on the node. The job becomes the program, which
// then gets the signals that Slurm sends.
func script(program, dir string, first int) string {
	return fmt.Sprintf("#!/bin/sh\n# A temporary folder of the machine that submitted this may not be here.\n[ -d \"${TMPDIR:-/tmp}\" ] || unset TMPDIR\nexec %s chunk %s %d\n",
		quote(program), quote(dir), first)
}

func quote(s string) string { return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'" }

// lay puts chunks of units into a batch and gives them back with their numbers.
func lay(b *batch, all []engine.Unit, chunks []*chunk) error {
	for _, ch := range chunks {
		units := make([]engine.Unit, len(ch.units))
		for i, u := range ch.units {
			units[i] = all[u]
		}
		var err error
		if ch.n, err = b.add(units); err != nil {
			return fmt.Errorf("no jobs can be described in %s: %w", b.dir, err)
		}
		ch.batch = b
	}
	return nil
}

// submitSome submits the longest array that Slurm takes of the chunks in line,
// and takes them out of the line. It gives none, and no error, when there is
// nothing to do but to wait.
func (r *round) submitSome(ctx context.Context) error {
	for len(r.line) > 0 && ctx.Err() == nil {
		// Chunks that follow one another in a batch, as many as an array may have.
		count := 1
		for count < len(r.line) && count < max(1, r.c.limit) && r.line[count].n == r.line[0].n+count {
			count++
		}
		for {
			units := 0
			for _, ch := range r.line[:count] {
				units = max(units, len(ch.units))
			}
			a, err := r.c.submit(ctx, r.batch, r.line[0].n, count, units)
			if err == nil {
				r.batch.arrays = append(r.batch.arrays, a)
				for i, ch := range r.line[:count] {
					ch.job, ch.index, ch.state = a.job, i, "SUBMITTED"
				}
				r.chunks = append(r.chunks, r.line[:count]...)
				r.line, r.refused = r.line[count:], 0
				break
			}
			var said *toolError
			if !errors.As(err, &said) {
				return err
			}
			switch judge(said.said) {
			case final:
				return &engine.Fault{Text: "Slurm refuses the work: " + err.Error()}
			case tooMany:
				if count > 1 {
					count = (count + 1) / 2
					continue
				}
			}
			// Whatever of ours is in the queue will make room; if nothing is,
			// patience has an end.
			if r.refused++; r.refused > patience && r.alive() == 0 {
				return &engine.Fault{Text: "Slurm takes no jobs: " + err.Error()}
			}
			r.waits = "Slurm takes no more jobs for now"
			return nil
		}
	}
	return nil
}

// patience is how many polls to wait while Slurm takes no jobs though none of
// ours are in the queue: ten minutes, by default.
const patience = 120

// jobsText is "Slurm job 17" or "Slurm jobs 17, 18".
func jobsText(jobs []int) string {
	if len(jobs) == 1 {
		return "Slurm job " + strconv.Itoa(jobs[0])
	}
	const most = 4
	var texts []string
	for _, j := range jobs[:min(len(jobs), most)] {
		texts = append(texts, strconv.Itoa(j))
	}
	text := "Slurm jobs " + strings.Join(texts, ", ")
	if len(jobs) > most {
		text += fmt.Sprintf(" and %d more", len(jobs)-most)
	}
	return text
}
