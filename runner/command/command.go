// Package command is the command line of rimlight.
package command

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"os/signal"
	"sync"
	"syscall"
	"time"

	"github.com/spf13/cobra"

	"rimlight/runner/diag"
	"rimlight/runner/plan"
	"rimlight/runner/worker"
)

// Exit statuses.
const (
	ExitDone        = 0   // done, and all checks passed
	ExitFailed      = 1   // a step failed
	ExitWrong       = 2   // the command or the recipe is wrong
	ExitCheckFailed = 3   // done, but a check in the report failed
	ExitInterrupted = 130 // interrupted; everything finished so far is kept
)

const exitHelp = `
Exit status:
  0    done, and all checks passed
  1    a step failed
  2    the command or the recipe is wrong
  3    done, but a check in the report failed
  130  interrupted; everything finished so far is kept`

// An exit is an error that carries the status to leave with. Its cause, which
// may be nil, has been told to the user when told is set.
type exit struct {
	status int
	cause  error
	told   bool
}

func (e *exit) Error() string {
	if e.cause == nil {
		return fmt.Sprintf("exit status %d", e.status)
	}
	return e.cause.Error()
}

func (e *exit) Unwrap() error { return e.cause }

// An app is one invocation of the program.
type app struct {
	args           []string
	stdout, stderr io.Writer
	terminal       bool // stderr is a terminal

	// What takes a while, and is begun while a worker looks at the recipe.
	executable func() string // SHA-256 of the program, in hex, "" when it can't be read
	library    func() (*plan.Library, error)
}

// Main is the whole program: a worker where the process was started as one,
// otherwise the command line. It does not return.
func Main() {
	if worker.Requested() {
		os.Exit(worker.Main())
	}
	os.Exit(Run(os.Args[1:], os.Stdout, os.Stderr))
}

// Run carries out one command line, without the program's name, and returns
// the exit status.
func Run(args []string, stdout, stderr io.Writer) int {
	signals := []os.Signal{os.Interrupt, syscall.SIGTERM}
	if !signal.Ignored(syscall.SIGHUP) { // as nohup has it
		signals = append(signals, syscall.SIGHUP) // the terminal was closed
	}
	ctx, stop := signal.NotifyContext(context.Background(), signals...)
	defer stop()
	// Another Ctrl-C ends the program at once, but not one that came with the
	// first, as from a program that sends it to the process and to its group.
	defer context.AfterFunc(ctx, func() { time.AfterFunc(time.Second, func() { signal.Reset(os.Interrupt) }) })()
	tuneCollector()
	a := &app{args: args, stdout: stdout, stderr: stderr, terminal: isTerminal(stderr),
		executable: sync.OnceValue(executableHash), library: sync.OnceValues(plan.OpenLibrary)}
	root := a.root()
	root.SetArgs(args)
	root.SetOut(stdout)
	root.SetErr(stderr)
	err := root.ExecuteContext(ctx)
	if err == nil {
		return ExitDone
	}
	var e *exit
	if !errors.As(err, &e) {
		e = &exit{status: ExitWrong, cause: err}
		var option *plan.OptionError
		var list diag.List
		if !errors.As(err, &option) && !errors.As(err, &list) && ctx.Err() != nil {
			e.status = ExitInterrupted
		}
	}
	if e.cause != nil && !e.told {
		fmt.Fprintf(stderr, "rimlight: %v\n", e.cause)
	}
	return e.status
}

func (a *app) root() *cobra.Command {
	root := &cobra.Command{
		Use:   "rimlight",
		Short: "From raw spectroscopic light curves of a transit to the planet's transmission spectrum, reproducibly",
		Long: `rimlight runs reductions of transit spectroscopy that are written as Markdown
recipes with embedded Go steps. Results are kept by what they were computed
from, and a run ends in one HTML report with the spectrum and its provenance.

A recipe is a program. Read a stranger's recipe before you run it.` + exitHelp,
		SilenceErrors: true,
		SilenceUsage:  true,
	}
	root.CompletionOptions.HiddenDefaultCmd = true
	root.AddCommand(a.runCommand(), a.checkCommand(), a.demoCommand(), a.storeCommand(), a.chunkCommand())
	return root
}

// tuneCollector lets garbage lie about in this process as in a worker: a run
// with everything known took a third less time. Whoever sets GOGC is obeyed.
var tuneCollector = sync.OnceFunc(func() {
	if os.Getenv("GOGC") == "" {
		worker.TuneCollector(math.MaxInt64)
	}
})
