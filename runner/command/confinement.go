package command

import (
	"fmt"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/pflag"

	"rimlight/runner/confine"
	"rimlight/runner/worker"
)

// A size is a number of bytes as a flag: "512MiB", "2GiB", or plain bytes.
type size int64

var sizeUnits = map[string]float64{"": 1, "B": 1, "KIB": 1 << 10, "MIB": 1 << 20, "GIB": 1 << 30, "TIB": 1 << 40, "KB": 1e3, "MB": 1e6, "GB": 1e9, "TB": 1e12}

func (s *size) Set(text string) error {
	t := strings.TrimSpace(text)
	number := strings.TrimRight(t, "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz ")
	unit, ok := sizeUnits[strings.ToUpper(strings.TrimSpace(t[len(number):]))]
	n, err := strconv.ParseFloat(number, 64)
	if err != nil || !ok || !(n*unit < 1<<60) || n < 0 {
		return fmt.Errorf("expected a size such as 512MiB or 2GiB")
	}
	*s = size(n * unit)
	return nil
}

func (s *size) String() string {
	if *s == 0 {
		return "as needed"
	}
	return strings.ReplaceAll(worker.Size(int64(*s)), " ", "")
}

func (s *size) Type() string { return "size" }

// limitFlags adds the flags that say what steps may use up.
func (o *options) limitFlags(f *pflag.FlagSet) {
	o.limits = worker.Options{StepTime: worker.DefaultStepTime}
	f.DurationVar(&o.limits.StepTime, worker.TimeFlag, worker.DefaultStepTime, "longest `DURATION` that a step, or one element of a fan-out, may take")
	f.Var((*size)(&o.limits.Memory), worker.MemoryFlag, "largest `SIZE` of memory that a worker process may use; as needed is "+worker.Size(worker.DefaultMemory)+" and six times the arguments of the step, up to three quarters of the machine's memory")
	f.BoolVar(&o.limits.Require, worker.RequireFlag, false, "refuse to run steps unless every layer of confinement is active")
}

// checkLimits refuses limits that nothing could work under.
func (o *options) checkLimits() error {
	if o.limits.StepTime < 100*time.Millisecond {
		return fmt.Errorf("--%s %v: expected at least 100ms", worker.TimeFlag, o.limits.StepTime)
	}
	if o.limits.Memory != 0 && o.limits.Memory < confine.MinMemory {
		return fmt.Errorf("--%s %s: expected at least %s", worker.MemoryFlag, worker.Size(o.limits.Memory), worker.Size(confine.MinMemory))
	}
	return nil
}

// showConfinement tells by what the steps are confined, and what is missing.
func (a *app) showConfinement(o *options) {
	active, missing := o.confined.Active(), o.confined.Missing()
	if o.json {
		m := map[string]any{"event": "confinement", "active": active}
		if len(missing) > 0 {
			names := map[string]string{}
			for _, l := range missing {
				names[l.Name] = l.Detail
			}
			m["missing"] = names
		}
		writeJSON(a.stdout, m)
		return
	}
	for _, l := range missing {
		fmt.Fprintf(a.stderr, "warning: steps are not confined by %s: %s\n", l.Name, l.Detail)
	}
	if !o.quiet {
		fmt.Fprintf(a.stderr, "steps are confined by %s\n", strings.Join(active, ", "))
	}
}

// confinement is what the report says about it.
func confinement(r confine.Report) []string {
	out := r.Active()
	for _, l := range r.Missing() {
		out = append(out, fmt.Sprintf("not by %s (%s)", l.Name, l.Detail))
	}
	return out
}
