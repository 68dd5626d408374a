package command

import (
	"bytes"
	"io"
	"os"
	"path/filepath"
	"testing"
	"time"

	"rimlight/recipes"
	"rimlight/steps/lightcurve"
	"rimlight/steps/simulate"
)

// visit writes the shipped recipe and simulated data for it into a folder, and
// returns the recipe's path.
func visit(tb testing.TB, dir string, scenario simulate.Scenario) string {
	tb.Helper()
	cube, _, err := simulate.Make(scenario)
	if err != nil {
		tb.Fatal(err)
	}
	raw, err := lightcurve.WriteFITS(cube)
	if err != nil {
		tb.Fatal(err)
	}
	recipe := filepath.Join(dir, "r.md")
	for path, data := range map[string][]byte{recipe: recipes.Continuous(), filepath.Join(dir, "visit.fits"): raw} {
		if err := os.WriteFile(path, data, 0o644); err != nil {
			tb.Fatal(err)
		}
	}
	return recipe
}

// night is a recipe of 400 channels of 500 integrations that has been run.
func night(b *testing.B) string {
	scenario := simulate.Continuous(3)
	scenario.Integrations, scenario.Channels, scenario.Cadence = 500, 400, 49
	recipe := visit(b, b.TempDir(), scenario)
	if status := Run([]string{"run", recipe, "--quiet"}, io.Discard, io.Discard); status != ExitDone && status != ExitCheckFailed {
		b.Fatalf("exit status %d", status)
	}
	return recipe
}

// BenchmarkKnown is the cost of doing nothing: of a run in which all results
// are known, report included, and of a check, each a process of its own, for
// the shipped recipe with 400 channels of 500 integrations. On a machine that is
// busy with other things, processor time says more than time.
func BenchmarkKnown(b *testing.B) {
	recipe := night(b)
	for _, command := range []string{"run", "check"} {
		b.Run(command, func(b *testing.B) {
			var busy time.Duration
			for b.Loop() {
				var errs bytes.Buffer
				c := rimlight(b, command, recipe, "--quiet")
				c.Stderr = &errs
				if c.Run(); c.ProcessState.ExitCode() != ExitDone && c.ProcessState.ExitCode() != ExitCheckFailed {
					b.Fatalf("%s: %s", c.ProcessState, errs.String())
				}
				busy += c.ProcessState.UserTime() + c.ProcessState.SystemTime()
			}
			b.ReportMetric(float64(busy.Milliseconds())/float64(b.N), "cpu-ms/op")
		})
	}
}

// BenchmarkKnownInside is the same without the start of a process, for
// profiles.
func BenchmarkKnownInside(b *testing.B) {
	recipe := night(b)
	for _, command := range []string{"run", "check"} {
		b.Run(command, func(b *testing.B) {
			for b.Loop() {
				Run([]string{command, recipe, "--quiet"}, io.Discard, io.Discard)
			}
		})
	}
}
