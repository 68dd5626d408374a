package fit

import (
	"bytes"
	"encoding/binary"
	"math"
	"os"
	"os/exec"
	"syscall"
	"testing"

	"rimlight/steps/lightcurve"
	"rimlight/steps/systematics"
)

// besideSciPy fits channels with testdata/fit/channels.py and samples them here. It
// returns the processor times of both, and holds the depths against one another.
func besideSciPy(t testing.TB, n, m int) (theirs, ours float64) {
	t.Helper()
	const python = "/usr/bin/python3"
	if err := exec.Command(python, "-c", "import numpy, scipy").Run(); err != nil {
		if os.Getenv("RIMLIGHT_REQUIRE") != "" {
			t.Fatal("NumPy or SciPy is missing")
		}
		t.Skip("NumPy or SciPy is missing")
	}
	s := newScene(t, 12, n, m)
	model := s.model()
	model.Trend.Polynomial = 2
	model.Channel = samplingPriors()
	white := Posterior{Names: []string{"midTransit", "axisRatio", "inclination", "radiusRatio"},
		Value: []float64{s.orbit.MidTransit, 9.4, 87.3, 0.111}, Err: []float64{1e-5, 0.02, 0.03, 1e-4}}
	curves := lightcurve.Curves(s.cube)
	trend := systematics.Trend{Polynomial: 2, Regressors: []string{"X", "Y"}}
	design, err := trend.Design(curves[0])
	if err != nil {
		t.Fatal(err)
	}
	var in bytes.Buffer
	write := func(x ...float64) {
		if err := binary.Write(&in, binary.LittleEndian, x); err != nil {
			t.Fatal(err)
		}
	}
	write(float64(n), float64(len(design.Columns)), float64(m))
	z := make([]float64, n)
	for i, time := range s.cube.Time {
		write(time - s.cube.Time[0])
		z[i], _ = s.orbit.Separation(time)
	}
	write(z...)
	for _, column := range design.Columns {
		write(column...)
	}
	for _, c := range curves {
		level := median(append([]float64(nil), c.Flux...))
		for _, x := range [][]float64{c.Flux, c.Err} {
			for _, v := range x {
				write(v / level)
			}
		}
	}
	command := exec.Command(python, "../../testdata/fit/channels.py")
	command.Env = append(os.Environ(), "OMP_NUM_THREADS=1", "OPENBLAS_NUM_THREADS=1")
	command.Stdin, command.Stderr = &in, os.Stderr
	raw, err := command.Output()
	if err != nil {
		t.Fatal(err)
	}
	if len(raw) != 8*(1+2*m) {
		t.Fatalf("%d bytes from SciPy for %d channels", len(raw), m)
	}
	value := func(i int) float64 { return math.Float64frombits(binary.LittleEndian.Uint64(raw[8*i:])) }
	var before, after syscall.Rusage
	_ = syscall.Getrusage(syscall.RUSAGE_SELF, &before)
	points, _, err := Channels(curves, white, model, Sampling{})
	_ = syscall.Getrusage(syscall.RUSAGE_SELF, &after)
	if err != nil {
		t.Fatal(err)
	}
	// Where data say little of the settling time, the best of all times and the mean over
	// them may give depths a standard deviation apart.
	apart := 0
	for k, p := range points {
		depth, sd := value(1+2*k), value(2+2*k)
		if !(math.Abs(p.Depth-depth) < 0.5*sd) {
			apart++
		}
		if !(math.Abs(p.Depth-depth) < 2*sd) {
			t.Errorf("channel %d: depth %.6g ± %.2g; SciPy has %.6g ± %.2g", k, p.Depth, p.DepthErr, depth, sd)
		}
	}
	if apart > m/3 {
		t.Errorf("%d of %d depths differ from SciPy's by half a standard deviation", apart, m)
	}
	return value(0), float64(after.Utime.Nano()+after.Stime.Nano()-before.Utime.Nano()-before.Stime.Nano()) / 1e9
}

func TestBesideSciPy(t *testing.T) { besideSciPy(t, 1200, 4) }

// BenchmarkChannelsBesideSciPy reports how many times the processor time of posteriors of
// 4000 effective draws a least-squares fit takes in SciPy.
func BenchmarkChannelsBesideSciPy(b *testing.B) {
	for b.Loop() {
		theirs, ours := besideSciPy(b, 6000, 24)
		b.ReportMetric(1000*theirs/24, "SciPy-ms/channel")
		b.ReportMetric(1000*ours/24, "ms/channel")
		b.ReportMetric(theirs/ours, "ratio")
	}
}
