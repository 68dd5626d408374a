package slurm

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"slices"
	"strconv"
	"strings"
	"time"
)

// toolTime is how long one of Slurm's commands may take.
const toolTime = 2 * time.Minute

// A toolError is that a command of Slurm's failed.
type toolError struct {
	name string
	said string // on standard error
	err  error
}

func (e *toolError) Error() string {
	said := strings.Join(strings.Fields(e.said), " ")
	if said == "" {
		said = e.err.Error()
	}
	return fmt.Sprintf("%s: %.500s", e.name, said)
}

func (e *toolError) Unwrap() error { return e.err }

// tool runs one of Slurm's commands and gives what it wrote. The language is
// set, as its words are read.
func tool(ctx context.Context, input, name string, args ...string) (string, error) {
	ctx, cancel := context.WithTimeout(ctx, toolTime)
	defer cancel()
	c := exec.CommandContext(ctx, name, args...)
	c.WaitDelay = time.Second
	c.Env = append(slices.DeleteFunc(os.Environ(), ofJob), "LC_ALL=C")
	c.Stdin = strings.NewReader(input)
	var out, errs bytes.Buffer
	c.Stdout, c.Stderr = &out, &errs
	if err := c.Run(); err != nil {
		if errors.Is(err, exec.ErrNotFound) {
			return "", fmt.Errorf("there is no %s on this machine: --on slurm needs the commands of Slurm, and works on a machine from which jobs are submitted", name)
		}
		return "", &toolError{name, errs.String(), err}
	}
	return out.String(), nil
}

// ofJob reports whether a variable of the environment describes the job that this
// process may itself be in, and would be taken for those of the jobs it submits.
func ofJob(variable string) bool {
	return strings.HasPrefix(variable, "SLURM_") && !strings.HasPrefix(variable, "SLURM_CONF=") && !strings.HasPrefix(variable, "SLURM_CLUSTERS=")
}

// queue lists the elements of the named jobs that are in the queue.
func queue(ctx context.Context, names []string) ([]task, error) {
	if len(names) == 0 {
		return nil, nil
	}
	text, err := tool(ctx, "", "squeue", "--noheader", "--array", "--user="+strconv.Itoa(os.Getuid()), "--name="+strings.Join(names, ","), "--format="+queueFormat)
	return parseQueue(text), err
}

// cancel takes jobs out of the queue. That some have left it is no error.
func cancel(ctx context.Context, names []string) error {
	if len(names) == 0 {
		return nil
	}
	args := []string{"--quiet", "--user=" + strconv.Itoa(os.Getuid())}
	var first error
	for _, n := range names {
		if _, err := tool(ctx, "", "scancel", append(args, "--name="+n)...); err != nil && first == nil {
			first = err
		}
	}
	return first
}
