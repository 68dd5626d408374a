package slurm

import (
	"fmt"
	"strconv"
	"strings"
)

// A task is an element of a job array in the queue, or a job without elements,
// whose index is 0.
type task struct {
	job, index int
	name       string // of the job
	state      string // PENDING, RUNNING, …
	node       string // "" while it has none
	reason     string // why it waits, "" when it does not
}

// queueFormat makes squeue write what parseQueue reads. The reason comes last,
// as it may hold anything.
const queueFormat = "%F|%K|%T|%j|%N|%r"

// parseQueue reads what squeue --array --noheader writes in the queueFormat. It
// leaves out lines that are not of that form, which are warnings of sites and
// wrappers.
func parseQueue(text string) []task {
	var out []task
	for _, line := range strings.Split(text, "\n") {
		f := strings.SplitN(strings.TrimSpace(line), "|", 6)
		if len(f) < 6 {
			continue
		}
		t := task{state: f[2], name: f[3], node: absent(f[4]), reason: absent(f[5])}
		var err error
		if t.job, err = strconv.Atoi(f[0]); err != nil || t.job <= 0 || t.state == "" {
			continue
		}
		if absent(f[1]) != "" {
			if t.index, err = strconv.Atoi(f[1]); err != nil || t.index < 0 {
				continue
			}
		}
		out = append(out, t)
	}
	return out
}

// absent is empty for the ways in which squeue writes that there is nothing.
func absent(s string) string {
	switch s {
	case "N/A", "None", "(null)", "(None)":
		return ""
	}
	return s
}

// alive reports whether a task is waiting, running, or will run again. States
// that are not known count as such: a job is not given up for a new word.
func (t task) alive() bool {
	switch t.state {
	case "COMPLETED", "CANCELLED", "FAILED", "TIMEOUT", "NODE_FAIL", "PREEMPTED", "BOOT_FAIL", "DEADLINE", "OUT_OF_MEMORY", "REVOKED", "LAUNCH_FAILED":
		return false
	}
	// It could not be started, and Slurm keeps it until somebody looks at it.
	return !strings.Contains(strings.ReplaceAll(strings.ToLower(t.reason), "_", " "), "launch failed requeued held")
}

// waiting reports whether a task has not begun.
func (t task) waiting() bool { return t.state == "PENDING" || strings.HasPrefix(t.state, "REQUEUE") }

// parseJob reads what sbatch --parsable writes: the job id and, on clusters of
// clusters, the cluster's name.
func parseJob(text string) (int, error) {
	lines := strings.Split(strings.TrimSpace(text), "\n")
	id, _, _ := strings.Cut(strings.TrimSpace(lines[len(lines)-1]), ";")
	n, err := strconv.Atoi(id)
	if err != nil || n <= 0 {
		return 0, fmt.Errorf("sbatch wrote %.200q, expected a job id", text)
	}
	return n, nil
}

// defaultArray is Slurm's own MaxArraySize.
const defaultArray = 1001

// parseArrayLimit reads what scontrol show config writes and gives the largest
// number of elements that an array may have, 0 where arrays are switched off.
func parseArrayLimit(text string) int {
	limit := defaultArray
	for _, line := range strings.Split(text, "\n") {
		name, value, ok := strings.Cut(line, "=")
		if !ok {
			continue
		}
		n, err := strconv.Atoi(strings.TrimSpace(value))
		if err != nil || n < 0 {
			continue
		}
		switch strings.TrimSpace(name) {
		case "MaxArraySize":
			limit = n
		case "MaxJobCount": // of all users together
			limit = min(limit, n)
		}
	}
	return limit
}

// A refusal is why sbatch did not take a job.
type refusal int

const (
	final    refusal = iota // as asked for, it will never be taken
	tooMany                 // fewer may be taken now, or as many later
	notReady                // Slurm did not answer
)

// judge reads what sbatch wrote to say no.
func judge(text string) refusal {
	t := strings.ToLower(text)
	has := func(words ...string) bool {
		for _, w := range words {
			if strings.Contains(t, w) {
				return true
			}
		}
		return false
	}
	switch {
	case has("maxsubmit", "submitjob", "job submit limit", "invalid job array specification", "maxjobcount", "temporarily unable to accept job"):
		return tooMany
	case has("unable to contact", "timed out", "connection refused", "communication", "zero bytes were transmitted", "try again"):
		return notReady
	}
	return final
}
