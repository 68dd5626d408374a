// Package confine takes away from a process what it has no need of, for good.
//
// A worker process needs to compute, and to speak through the pipes that it
// was born with. [Enter] leaves it that and no more, in layers: each is of use
// alone, and an attack has to get through all of them. Most layers are the
// kernel's and exist on Linux only; a layer that is not to be had is reported,
// and it is up to the caller what to make of that.
package confine

import (
	"fmt"
	"runtime/debug"
	"time"
)

// Limits are what a process may use up from the time it is confined.
type Limits struct {
	Memory  int64         // bytes of private memory that can be written, at least MinMemory
	Stack   int64         // bytes of one goroutine's stack, at least 1 MiB
	CPU     time.Duration // processor time of all threads since the start of the process, at least 1 s
	Threads int           // threads of the operating system, at least 8
	Keep    int           // descriptors that stay open, from number 3 on
}

// MinMemory is the least memory, in bytes, that a process of this program can
// do anything with.
const MinMemory = 128 << 20

// CPUMessage is the last that a process writes when its processor time is used
// up.
const CPUMessage = "fatal error: processor time used up"

// A Layer is one means of confinement.
type Layer struct {
	Name   string // short and fixed, such as "Landlock"
	Active bool
	Detail string // what it takes away; when not active, why it is missing
}

// A Report lists all layers, in the order in which they were put on.
type Report []Layer

// Missing lists the layers that are not active.
func (r Report) Missing() []Layer {
	var out []Layer
	for _, l := range r {
		if !l.Active {
			out = append(out, l)
		}
	}
	return out
}

// Active lists the names of the layers that are active.
func (r Report) Active() []string {
	var out []string
	for _, l := range r {
		if l.Active {
			out = append(out, l.Name)
		}
	}
	return out
}

// Enter confines this process. There is no way back. The error is for limits
// that make no sense; then nothing was done.
func Enter(l Limits) (Report, error) {
	if l.Memory < MinMemory || l.Stack < 1<<20 || l.CPU < time.Second || l.Threads < 8 || l.Keep < 0 {
		return nil, fmt.Errorf("limits too small to work under: %d bytes of memory, %d of stack, %v of processor time, %d threads, %d descriptors",
			l.Memory, l.Stack, l.CPU, l.Threads, l.Keep)
	}
	debug.SetTraceback("none")
	debug.SetMaxStack(int(l.Stack))
	debug.SetMaxThreads(l.Threads)
	// The collector works harder from here on, well before the kernel refuses
	// more memory, which no Go program survives.
	debug.SetMemoryLimit(l.Memory / 4 * 3)
	return append(Report{{"runtime limits", true, "stack and threads"}}, kernel(l)...), nil
}

// layer is the outcome of putting on one layer.
func layer(name, detail string, err error) Layer {
	if err != nil {
		return Layer{name, false, err.Error()}
	}
	return Layer{name, true, detail}
}
