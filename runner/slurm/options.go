package slurm

import (
	"fmt"
	"os"
	"strconv"
	"strings"
	"time"

	"rimlight/runner/worker"
)

// Options are what a user asks of the cluster. Only Chunk, Poll and CPUs have to
// be set.
type Options struct {
	Partition string
	Account   string
	Time      time.Duration // wall time of a chunk; 0: four times what it should take, and never less than a step may
	Memory    int64         // bytes for a chunk; 0: what its workers may use, and something for their parent
	CPUs      int           // processors of a chunk, each with a worker
	Extra     []string      // further options of sbatch, as given to it
	Chunk     time.Duration // computing time that a chunk should have, on one processor
	Over      time.Duration // work of less computing time than that stays here; 0: none does
	Poll      time.Duration // how often squeue is asked
}

// Defaults.
const (
	DefaultChunk = 5 * time.Minute
	DefaultOver  = time.Minute
	DefaultPoll  = 5 * time.Second
)

// What goes with the time and memory of workers in a job.
const (
	extraTime   = 5 * time.Minute
	extraMemory = 1 << 30 // the arguments of the step, and what is to be written
)

// Check refuses options that nothing could work with.
func (o Options) Check() error {
	switch {
	case o.CPUs < 1:
		return fmt.Errorf("--slurm-cpus %d: expected at least 1", o.CPUs)
	case o.Chunk <= 0:
		return fmt.Errorf("--slurm-chunk %v: expected more than 0", o.Chunk)
	case o.Over < 0:
		return fmt.Errorf("--slurm-over %v: expected at least 0", o.Over)
	case o.Time != 0 && o.Time < time.Minute:
		return fmt.Errorf("--slurm-time %v: expected at least a minute", o.Time)
	case o.Poll < 50*time.Millisecond:
		return fmt.Errorf("--slurm-poll %v: expected at least 50ms", o.Poll)
	}
	for _, x := range o.Extra {
		if !strings.HasPrefix(x, "-") {
			return fmt.Errorf("--slurm-option %s: expected an option of sbatch, such as --qos=short", x)
		}
	}
	return nil
}

// sizes cuts n units that take so long each into chunks of about the same size.
func (o Options) sizes(n int, each time.Duration) []int {
	per := 1
	if each > 0 {
		per = int(max(1, min(int64(n), int64(o.Chunk)*int64(o.CPUs)/int64(each))))
	}
	chunks := (n + per - 1) / per
	out := make([]int, chunks)
	for i := range out {
		out[i] = (i+1)*n/chunks - i*n/chunks
	}
	return out
}

// request are the options of sbatch that ask for resources for chunks of so
// many units.
func (o Options) request(units int, each time.Duration, limits worker.Options) []string {
	wall := o.Time
	if wall == 0 {
		rounds := (units + o.CPUs - 1) / o.CPUs
		wall = max(4*time.Duration(rounds)*each, limits.StepTime) + extraTime
	}
	memory := o.Memory
	if memory == 0 {
		memory = int64(o.CPUs)*limits.Memory + extraMemory
	}
	out := []string{
		"--nodes=1", "--ntasks=1", fmt.Sprintf("--cpus-per-task=%d", o.CPUs),
		fmt.Sprintf("--time=%d", (wall+time.Minute-1)/time.Minute),
		fmt.Sprintf("--mem=%dM", (memory+1<<20-1)>>20),
	}
	if o.Partition != "" {
		out = append(out, "--partition="+o.Partition)
	}
	if o.Account != "" {
		out = append(out, "--account="+o.Account)
	}
	return append(out, o.Extra...)
}

// jobID is how Slurm calls the job that this process is, "" when it is none.
func jobID() string {
	if array := os.Getenv("SLURM_ARRAY_JOB_ID"); array != "" {
		return array + "_" + os.Getenv("SLURM_ARRAY_TASK_ID")
	}
	return os.Getenv("SLURM_JOB_ID")
}

// environment reads a number that Slurm gives to its jobs, 0 when it does not.
func environment(name string) int {
	n, _ := strconv.Atoi(os.Getenv(name))
	return n
}
