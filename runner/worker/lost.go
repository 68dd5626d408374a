package worker

import (
	"fmt"
	"os"
	"strings"
	"sync"
	"syscall"
	"time"

	"rimlight/runner/confine"
)

// A Cause is why a worker ended without an answer.
type Cause string

// Causes. All but the last two are the doing of what the worker was asked.
const (
	OutOfMemory   Cause = "memory"
	OutOfTime     Cause = "processor time"
	OutOfStack    Cause = "stack"
	ForbiddenCall Cause = "forbidden system call"
	Crashed       Cause = "crash"  // of the interpreter or the library
	Malformed     Cause = "answer" // malformed, or larger than it may be
	Killed        Cause = "killed" // by a signal from outside
	Vanished      Cause = "lost"
)

// A LostError says that a worker ended without answering.
type LostError struct {
	Cause  Cause
	How    string // how the process ended
	Stderr string // the last that it wrote
	task   string // kind of the question
	limits Options
}

// Outside reports whether the end may have had nothing to do with what the
// worker was asked, so that asking again is worth while.
func (e *LostError) Outside() bool { return e.Cause == Killed || e.Cause == Vanished }

// Error says in one line what happened and what to do about it.
func (e *LostError) Error() string {
	checking := e.task == askCheck
	switch e.Cause {
	case OutOfMemory:
		if checking {
			return fmt.Sprintf("out of memory: the code needs more than %s to be checked; look for a huge constant or type", Size(e.limits.Memory))
		}
		return fmt.Sprintf("out of memory: more than %s were needed; keep less at a time, or raise --%s", Size(e.limits.Memory), MemoryFlag)
	case OutOfTime:
		return fmt.Sprintf("out of processor time; make it shorter, or raise --%s", TimeFlag)
	case OutOfStack:
		if checking {
			return "out of stack: the code is nested too deeply to be checked"
		}
		return "out of stack: look for a function that calls itself without end"
	case ForbiddenCall:
		return "stopped at a system call that recipes have no business with; nothing that a recipe may use makes it, so it is a fault of rimlight or an attack"
	case Crashed:
		return fmt.Sprintf("the worker process crashed (%s); this is a fault of rimlight, which the code has hit upon", reason(e.Stderr))
	case Malformed:
		return "the worker's answer was refused: " + e.How
	case Killed:
		return "the worker process was killed from outside: " + e.How
	}
	s := "the worker process ended without an answer: " + e.How
	if r := reason(e.Stderr); r != "" {
		s += "; it said: " + r
	}
	return s
}

// reason is the line of a dying Go program that says why it dies.
func reason(stderr string) string {
	first := ""
	for _, line := range strings.Split(stderr, "\n") {
		line = strings.TrimSpace(line)
		if strings.HasPrefix(line, "fatal error: ") || strings.HasPrefix(line, "panic: ") {
			return plain(line, 300)
		}
		if first == "" {
			first = plain(line, 300)
		}
	}
	return first
}

// A TimeLimitError says that a question took longer than it may, by the clock
// on the wall, and was stopped.
type TimeLimitError struct {
	Limit time.Duration
	Flag  string // that raises the limit, "" when none does
}

// Error says which limit it was and what to do about it.
func (e *TimeLimitError) Error() string {
	if e.Flag == "" {
		return fmt.Sprintf("stopped after %v, which is long enough to check any code; look for a huge constant or type", e.Limit)
	}
	return fmt.Sprintf("stopped after %v, the time limit; look for a loop without end, or raise --%s", e.Limit, e.Flag)
}

// An UnconfinedError says which layers of confinement are missing that were
// required.
type UnconfinedError struct{ Missing []confine.Layer }

func (e *UnconfinedError) Error() string {
	var parts []string
	for _, l := range e.Missing {
		parts = append(parts, fmt.Sprintf("%s (%s)", l.Name, l.Detail))
	}
	return fmt.Sprintf("--%s: steps cannot be confined by %s; nothing was run", RequireFlag, strings.Join(parts, ", nor by "))
}

// causeOf finds out why a process ended, from its state, from what it used up
// and from its last words. Words are believed where they explain the end: who
// lies with them forgoes being run again, no more.
func causeOf(state *os.ProcessState, stderr string, limits Options) (Cause, string) {
	if state == nil {
		return Vanished, "its state is not known"
	}
	said := func(words ...string) bool {
		for _, w := range words {
			if strings.Contains(stderr, w) {
				return true
			}
		}
		return false
	}
	how := state.String()
	status, _ := state.Sys().(syscall.WaitStatus)
	switch {
	case status.Signaled() && status.Signal() == forbiddenSignal:
		return ForbiddenCall, how
	case status.Signaled() && status.Signal() == syscall.SIGKILL:
		switch cpu := state.UserTime() + state.SystemTime(); {
		case peakMemory(state) > limits.Memory/2:
			return OutOfMemory, how // the kernel's own way to make room
		case cpu > limits.limits(0).CPU:
			return OutOfTime, how
		}
		return Killed, how
	case said(confine.CPUMessage):
		return OutOfTime, how
	case said("stack exceeds", "stack overflow"):
		return OutOfStack, how
	case said("out of memory", "cannot allocate memory", "failed to create new OS thread", "pthread_create failed", "errno=12"):
		return OutOfMemory, how
	case said("fatal error:", "panic:", "runtime:", "thread limit", "SIGSEGV", "SIGBUS", "SIGABRT", "unexpected signal"):
		return Crashed, how
	case status.Signaled():
		return Killed, how
	}
	return Vanished, how
}

// ends keeps the beginning and the end of what is written to it. A Go program
// that dies says why first, and then at length where.
type ends struct {
	mu         sync.Mutex
	head, tail []byte
	max        int // bytes of each
}

func (e *ends) Write(p []byte) (int, error) {
	e.mu.Lock()
	defer e.mu.Unlock()
	n := len(p)
	if room := min(e.max-len(e.head), n); room > 0 {
		e.head, p = append(e.head, p[:room]...), p[room:]
	}
	e.tail = append(e.tail, p[max(0, len(p)-e.max):]...)
	e.tail = e.tail[max(0, len(e.tail)-e.max):]
	return n, nil
}

func (e *ends) String() string {
	e.mu.Lock()
	defer e.mu.Unlock()
	return plain(string(e.head)+string(e.tail), 2*e.max)
}

// plain makes text from a worker fit for a terminal and a report: at most max
// bytes, and no control characters but line ends and tabs.
func plain(s string, max int) string {
	total := len(s)
	if total > max {
		s = s[:max]
	}
	s = strings.ToValidUTF8(s, "�")
	s = strings.Map(func(r rune) rune {
		if r != '\n' && r != '\t' && (r < ' ' || r >= 0x7f && r < 0xa0 || r >= 0x202a && r <= 0x202e || r >= 0x2066 && r <= 0x2069) {
			return '�'
		}
		return r
	}, s)
	if total > max {
		s += fmt.Sprintf(" … (%s in all)", Size(int64(total)))
	}
	return s
}
