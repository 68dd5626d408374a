package command

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"runtime"
	"sync"
	"sync/atomic"
	"syscall"
	"testing"
	"time"

	"rimlight/runner/plan"
	"rimlight/steps/diagnose"
	"rimlight/steps/figure"
	"rimlight/steps/fit"
	"rimlight/steps/lightcurve"
	"rimlight/steps/limbtable"
	"rimlight/steps/simulate"
	"rimlight/steps/spectrum"
	"rimlight/steps/systematics"
)

// BenchmarkCold runs the shipped recipe on the data of the demo, and on those of
// a longer visit with more channels: once as compiled calls of the step library in this process, with as many goroutines
// as a run has workers, and once through the program, with nothing known, from
// the start of the process to the written report. What the second takes beyond
// the first is the cost of the runner: parsing, checking, interpreting, keys,
// store, processes, report.
func BenchmarkCold(b *testing.B) {
	demo := simulate.Continuous(1)
	long := demo
	long.Channels, long.Integrations, long.Cadence, long.Exposure = 400, 6000, demo.Cadence/2, demo.Exposure/2
	b.Run("demo", func(b *testing.B) { benchmarkCold(b, demo) })
	b.Run("400x6000", func(b *testing.B) { benchmarkCold(b, long) })
}

func benchmarkCold(b *testing.B, scenario simulate.Scenario) {
	dir := b.TempDir()
	recipe := visit(b, dir, scenario)
	p, _, err := prepare(context.Background(), recipe, defaults())
	if err != nil {
		b.Fatal(err)
	}
	store, out := filepath.Join(dir, "rimlight.store"), filepath.Join(dir, "r.out")
	var native, whole, nativeBusy, wholeBusy time.Duration
	var fromNative []byte
	for b.Loop() {
		busy, began := processorTime(b), time.Now()
		fromNative = shippedNatively(b, p)
		native += time.Since(began)
		nativeBusy += processorTime(b) - busy

		for _, d := range []string{store, out} {
			if err := os.RemoveAll(d); err != nil {
				b.Fatal(err)
			}
		}
		syscall.Sync() // of what went before, which is not to count here
		var errs bytes.Buffer
		c := rimlight(b, "run", recipe, "--quiet")
		c.Stderr = &errs
		began = time.Now()
		if c.Run(); c.ProcessState.ExitCode() != ExitDone && c.ProcessState.ExitCode() != ExitCheckFailed {
			b.Fatalf("%s: %s", c.ProcessState, errs.String())
		}
		whole += time.Since(began)
		wholeBusy += c.ProcessState.UserTime() + c.ProcessState.SystemTime()
	}
	fromRun, err := os.ReadFile(filepath.Join(out, csvFile))
	if err != nil || !bytes.Equal(fromRun, fromNative) {
		b.Errorf("the spectra differ: %v", err)
	}
	n := float64(b.N)
	b.ReportMetric(native.Seconds()*1e3/n, "native-ms")
	b.ReportMetric(whole.Seconds()*1e3/n, "run-ms")
	b.ReportMetric(100*(whole.Seconds()/native.Seconds()-1), "overhead-%")
	b.ReportMetric(nativeBusy.Seconds()*1e3/n, "native-cpu-ms")
	b.ReportMetric(wholeBusy.Seconds()*1e3/n, "run-cpu-ms")
	b.ReportMetric(100*(wholeBusy.Seconds()/nativeBusy.Seconds()-1), "cpu-overhead-%")
	b.ReportMetric(0, "ns/op") // of both together says nothing
}

// processorTime is what this process has used up.
func processorTime(b *testing.B) time.Duration {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		b.Fatal(err)
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}

// shippedNatively makes the calls of the shipped recipe, and returns the
// spectrum as CSV.
func shippedNatively(b *testing.B, p *plan.Plan) []byte {
	must := func(err error) {
		b.Helper()
		if err != nil {
			b.Fatal(err)
		}
	}
	set := func(step, name string) any {
		for _, s := range p.Steps {
			for _, a := range s.Args {
				if s.Name == step && a.Name == name {
					return a.Value
				}
			}
		}
		b.Fatalf("step %s has no argument %s", step, name)
		return nil
	}
	number := func(name string) float64 { return set("Declare", name).(float64) }
	word := func(name string) string { return set("Declare", name).(string) }

	file, err := os.ReadFile(p.Inputs[0].Paths[0])
	must(err)
	raw, _, err := lightcurve.ReadFITS(file, nil)
	must(err)
	clean, err := lightcurve.SkipStart(raw, set("Clean", "skipStart").(float64))
	must(err)
	clean, err = lightcurve.MaskOutliers(clean, lightcurve.RunningMedian{Window: set("Clean", "clipWindow").(int), Sigma: set("Clean", "clipSigma").(float64)})
	must(err)
	clean, _, err = lightcurve.RescaleErrors(clean)
	must(err)
	lightcurve.Masked(clean)
	_, err = figure.Map(clean)
	must(err)
	white, err := lightcurve.White(clean)
	must(err)
	model := fit.Model{
		Period: number("period"), MidTransit: number("midTransit"), AxisRatio: number("axisRatio"), Inclination: number("inclination"),
		Eccentricity: number("eccentricity"), Periastron: number("periastron"), RadiusRatio: number("radiusRatio"), Exposure: number("exposure"),
		LimbLaw: word("limbLaw"), LimbPolicy: word("limbPolicy"), Limb: limbtable.Table{},
		Trend: systematics.Trend{Polynomial: set("Declare", "trendOrder").(int), Settling: set("Declare", "settling").(bool),
			SettlingTime: number("settlingTime"), Regressors: set("Declare", "regressors").([]string)},
		White: set("Declare", "priors").(fit.Priors), Channel: set("DeclareChannels", "priors").(fit.Priors),
	}
	geometry, whiteFit, _, err := fit.WhiteOrbit(white, model, set("FitWhite", "orbitFrom").(string))
	must(err)
	_, err = figure.WhiteFit(whiteFit)
	must(err)
	channels := lightcurve.Curves(clean)
	points, fits, errs := make([]spectrum.Point, len(channels)), make([]diagnose.Summary, len(channels)), make([]error, len(channels))
	var next atomic.Int64
	var all sync.WaitGroup
	for range runtime.NumCPU() {
		all.Go(func() {
			for n := int(next.Add(1)) - 1; n < len(channels); n = int(next.Add(1)) - 1 {
				var fitted fit.CurveFit
				if points[n], fitted, errs[n] = fit.Channel(channels[n], geometry, model); errs[n] == nil {
					fits[n], errs[n] = diagnose.Summarise(fitted)
				}
			}
		})
	}
	all.Wait()
	for _, err := range errs {
		must(err)
	}
	_, err = figure.Detrended(fits)
	must(err)
	_, err = figure.ChannelGrid(fits, points)
	must(err)
	_, err = figure.LimbDarkening(points)
	must(err)
	_, err = figure.BinnedScatter(whiteFit, fits)
	must(err)
	depths, err := spectrum.Assemble(points, fit.SharedCovariance(points, geometry))
	must(err)
	_, err = figure.Spectrum(depths)
	must(err)
	diagnose.FitChecks("white light curve", geometry)
	diagnose.ResidualChecks(whiteFit, fits)
	diagnose.SpectrumChecks(depths)
	return spectrum.CSV(depths)
}
