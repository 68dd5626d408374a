package command

import (
	"context"
	"fmt"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"rimlight/runner/engine"
	"rimlight/runner/slurm"
)

// Places to compute at.
const (
	local   = "local"
	onSlurm = "slurm"
)

// slurmFolder is the folder within that of the report where jobs are described
// and their logs are gathered.
const slurmFolder = "slurm"

// slurmFlags adds the flags that say what is asked of a cluster.
func (o *options) slurmFlags(f *pflag.FlagSet) {
	s := &o.slurm
	f.StringVar(&s.Partition, "slurm-partition", "", "`PARTITION` of the cluster (default: its own)")
	f.StringVar(&s.Account, "slurm-account", "", "`ACCOUNT` that the computing time is charged to (default: your own)")
	f.DurationVar(&s.Time, "slurm-time", 0, "wall time of a job, a `DURATION` (default: four times what it should take, at least --step-time)")
	f.Var((*size)(&s.Memory), "slurm-memory", "memory of a job, a `SIZE` (default: --step-memory for each processor, and 1GiB)")
	f.IntVar(&s.CPUs, "slurm-cpus", 1, "processors of a job")
	f.DurationVar(&s.Chunk, "slurm-chunk", slurm.DefaultChunk, "computing time that a job should have for each processor")
	f.DurationVar(&s.Over, "slurm-over", slurm.DefaultOver, "steps of less computing time than this `DURATION` are computed here; 0: none is")
	f.StringArrayVar(&s.Extra, "slurm-option", nil, "a further `OPTION` of sbatch, such as --slurm-option=--qos=short")
	f.DurationVar(&s.Poll, "slurm-poll", slurm.DefaultPoll, "how often squeue is asked; a job's results are waited for twelve times as long after it ended")
	f.Lookup("slurm-memory").DefValue = "" // said above
}

// checkPlace refuses places that are not known, and flags for another one.
func (o *options) checkPlace() error {
	switch o.on {
	case onSlurm:
		return o.slurm.Check()
	case local:
		var given []string
		o.given.Visit(func(f *pflag.Flag) {
			if strings.HasPrefix(f.Name, "slurm-") {
				given = append(given, "--"+f.Name)
			}
		})
		if len(given) > 0 {
			return fmt.Errorf("%s: only with --on slurm", strings.Join(given, ", "))
		}
		return nil
	}
	return fmt.Errorf("--on %s: expected local or slurm", o.on)
}

// place gets ready what --on asks for. What is to be called when the run is over
// gives what there is to tell.
func (o *options) place(ctx context.Context, e *engine.Engine) (end func() []string, err error) {
	if o.on != onSlurm {
		return func() []string { return nil }, nil
	}
	c, err := slurm.Open(ctx, filepath.Join(o.out, slurmFolder), e.Store, e.Library, e.Build, o.slurm)
	if err != nil {
		return nil, err
	}
	e.Elsewhere = c
	return func() []string {
		e.Elsewhere = nil // what is found damaged from now on is mended here
		c.Close()
		return c.Notes()
	}, nil
}

// chunkCommand is what jobs of a cluster start.
func (a *app) chunkCommand() *cobra.Command {
	return &cobra.Command{
		Use:    "chunk DIR FIRST",
		Short:  "Compute a chunk of a step's elements, as a job of a Slurm cluster",
		Hidden: true,
		Args:   cobra.ExactArgs(2),
		RunE: func(c *cobra.Command, args []string) error {
			var first int
			if _, err := fmt.Sscan(args[1], &first); err != nil || first < 0 {
				return fmt.Errorf("%s: expected the number of a chunk", args[1])
			}
			if err := slurm.RunChunk(c.Context(), args[0], first, a.stderr); err != nil {
				return &exit{status: ExitFailed, cause: err}
			}
			return nil
		},
	}
}
