package worker

import (
	"fmt"
	"runtime"
	"strings"
	"time"

	"rimlight/runner/confine"
)

// Options are the limits that a worker lives under.
type Options struct {
	StepTime time.Duration // longest that one question may take, by the clock on the wall
	Memory   int64         // bytes, at least confine.MinMemory; 0 for as much as what is handled asks for
	Require  bool          // do not work unless every layer of confinement is active

	given int64 // bytes of arguments, or of files
}

// Limits where nobody asks for others.
const (
	DefaultStepTime = 30 * time.Minute
	DefaultMemory   = 2 << 30 // beside what the arguments ask for
)

// Names of the flags that set the options, for messages.
const (
	TimeFlag    = "step-time"
	MemoryFlag  = "step-memory"
	RequireFlag = "require-confinement"
)

// Limits of workers that run no step.
const (
	checkTime     = 20 * time.Second
	checkMemory   = 512 << 20
	readTime      = time.Minute
	readPerSecond = 1 << 20 // bytes of files that are read in a second on the slowest of machines
	readMemory    = 512 << 20
	readExpansion = 16 // bytes of memory for each byte of a file: numbers of one digit grow most
	stepExpansion = 6  // bytes of memory for each byte of arguments: these, as much of results, and work space
)

// For are the options for a worker that takes in arguments of so many bytes:
// where nobody has set its memory, it may use DefaultMemory and six times the
// arguments, but no more than three quarters of the machine's.
func (o Options) For(arguments int64) Options {
	o = o.filled()
	o.given = arguments
	if o.Memory == 0 {
		o.Memory = max(DefaultMemory, min(DefaultMemory+stepExpansion*min(arguments, 1<<50), machineMemory()/4*3))
	}
	return o
}

// Checking are the options for a worker that checks code.
func (o Options) Checking() Options {
	o = o.For(0)
	o.StepTime, o.Memory = min(o.StepTime, checkTime), min(o.Memory, checkMemory)
	return o
}

// Reading are the options for a worker that reads files of the given size, in
// bytes, together.
func (o Options) Reading(size int64) Options {
	o = o.For(size * readExpansion / stepExpansion)
	o.given = size
	o.StepTime = min(o.StepTime, readTime+time.Duration(size/readPerSecond)*time.Second)
	if size < o.Memory/readExpansion {
		o.Memory = min(o.Memory, readMemory+readExpansion*size)
	}
	return o
}

// filled has the default in the place of no time.
func (o Options) filled() Options {
	if o.StepTime == 0 {
		o.StepTime = DefaultStepTime
	}
	return o
}

// results is how many bytes the results of one step may have. They take disk
// rather than memory: encoded, they can be larger than in the worker, where
// slices may share what is in them.
func (o Options) results() int64 { return o.Memory/4 + 4*min(o.given, 1<<50) }

// limits are what the worker is told to live under. The processor time is for
// the whole life of a worker, which goes on until its questions have taken the
// time of one, and so may take that of two; it ends workers that the parent
// fails to end.
func (o Options) limits(files int) limitsHead {
	return limitsHead{confine.Limits{
		Memory:  o.Memory,
		Stack:   64 << 20,
		CPU:     2*o.StepTime*time.Duration(runtime.NumCPU()) + 5*time.Second,
		Threads: 40 + 2*runtime.NumCPU(),
		Keep:    files,
	}, o.results()}
}

// limitsHead is the first question that a worker is asked.
type limitsHead struct {
	confine.Limits
	Results int64 // bytes that the results of a step may have together
}

// Size writes a number of bytes as a person would: "2 GiB".
func Size(n int64) string {
	for _, u := range []struct {
		name string
		size int64
	}{{"GiB", 1 << 30}, {"MiB", 1 << 20}, {"KiB", 1 << 10}} {
		if n >= u.size {
			s := fmt.Sprintf("%.1f", float64(n)/float64(u.size))
			return strings.TrimSuffix(s, ".0") + " " + u.name
		}
	}
	return fmt.Sprintf("%d bytes", n)
}
