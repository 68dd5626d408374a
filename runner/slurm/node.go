package slurm

import (
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"time"

	"rimlight/runner/engine"
	"rimlight/runner/plan"
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// RunChunk is what a job does: it computes a chunk of the batch in dir. The
// chunk's number is first plus the index of this process in its job array. What
// becomes of it is written to the chunk's progress file, and for people to log.
// The error is why the chunk could not be computed, if that could not be
// written there either.
func RunChunk(ctx context.Context, dir string, first int, log io.Writer) error {
	b := &batch{dir: dir}
	n := first + environment("SLURM_ARRAY_TASK_ID")
	host := os.Getenv("SLURMD_NODENAME")
	if host == "" {
		host, _ = os.Hostname()
	}
	restart := environment("SLURM_RESTART_COUNT")
	p, err := newReporter(b.path(progressOf(n, restart)))
	if err != nil {
		return err
	}
	who := fmt.Sprintf("%s, Slurm job %s", host, jobID())
	p.lines <- report{Begin: who}
	fmt.Fprintf(log, "%s chunk %d of %s on %s, process %d, restarted %d times\n", stamp(), n, filepath.Base(dir), who, os.Getpid(), restart)
	if err := b.carry(ctx, n, who, p, log); err != nil {
		fmt.Fprintf(log, "%s refused: %v\n", stamp(), err)
		p.lines <- report{Refused: faultOf(err)}
	}
	if ctx.Err() == nil {
		p.lines <- report{End: true}
	}
	fmt.Fprintf(log, "%s end\n", stamp())
	return p.close()
}

func stamp() string { return time.Now().UTC().Format(time.RFC3339) }

func faultOf(err error) *engine.Fault {
	if f, ok := err.(*engine.Fault); ok {
		return f
	}
	return &engine.Fault{Text: err.Error()}
}

// carry computes the units of a chunk.
func (b *batch) carry(ctx context.Context, n int, who string, p *reporter, log io.Writer) error {
	opened, err := openBatch(b.dir)
	if err != nil {
		return err
	}
	w := opened.work
	lib, err := plan.OpenLibrary()
	if err != nil {
		return err
	}
	build := plan.ReadBuild()
	if why := plan.Fingerprint(lib, build).Why(w.Program); why != "" {
		return fmt.Errorf("%s would not compute the same as the machine that submitted the work: %s", who, why)
	}
	if w.Units, err = b.units(n); err != nil {
		return err
	}
	if !store.Is(w.Store) {
		return fmt.Errorf("there is no store %s on %s: it has to be on a folder that all nodes see under the same path", w.Store, who)
	}
	s, err := store.Open(w.Store)
	if err != nil {
		return err
	}
	release, notes, err := s.Use(ctx)
	if err != nil {
		return err
	}
	defer release()
	for _, n := range notes {
		fmt.Fprintf(log, "%s %s\n", stamp(), n)
	}
	if err := s.Limit(w.Reserve, w.Most); err != nil {
		return err
	}
	probe, err := worker.Start(ctx, w.Limits.Checking())
	if err != nil {
		return err
	}
	layers := probe.Confinement()
	probe.Close()
	fmt.Fprintf(log, "%s %d units of step %s, %d at a time; confined by %v\n", stamp(), len(w.Units), w.Step, w.CPUs, layers.Active())
	e := &engine.Engine{Store: s, Library: lib, Build: build, Code: w.Code, Jobs: w.CPUs, Host: who, Limits: w.Limits, Confinement: layers}
	done := 0
	err = e.Carry(ctx, w.Work, func(unit int, err error) {
		r := report{Unit: &unit}
		switch {
		case err == engine.ErrUntried:
			r.Untried = true
		case err != nil:
			r.Fault = faultOf(err)
			fmt.Fprintf(log, "%s unit %d failed: %v\n", stamp(), unit+1, err)
		default:
			done++
		}
		p.lines <- r
	})
	for _, n := range e.Notes() {
		fmt.Fprintf(log, "%s %s\n", stamp(), n)
	}
	fmt.Fprintf(log, "%s %d of %d units have results\n", stamp(), done, len(w.Units))
	return err
}
