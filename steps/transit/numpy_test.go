package transit

import (
	"bytes"
	"encoding/binary"
	"math"
	"os"
	"os/exec"
	"testing"
	"time"
)

// numpy runs testdata/transit/quadratic.py and returns its time for one call and
// what it computes: flux and derivatives by r, z, u1 and u2.
func numpy(t testing.TB, r, u1, u2 float64, z []float64) (time.Duration, [5][]float64) {
	t.Helper()
	const python = "/usr/bin/python3"
	if err := exec.Command(python, "-c", "import numpy").Run(); err != nil {
		if os.Getenv("RIMLIGHT_REQUIRE") != "" {
			t.Fatal("NumPy is missing")
		}
		t.Skip("NumPy is missing")
	}
	var in bytes.Buffer
	for _, v := range append([]float64{r, u1, u2}, z...) {
		binary.Write(&in, binary.LittleEndian, v)
	}
	command := exec.Command(python, "../../testdata/transit/quadratic.py")
	command.Stdin = &in
	raw, err := command.Output()
	if err != nil {
		t.Fatal(err)
	}
	values := make([]float64, len(raw)/8)
	if len(values) != 1+5*len(z) {
		t.Fatalf("%d numbers for %d separations", len(values), len(z))
	}
	for i := range values {
		values[i] = math.Float64frombits(binary.LittleEndian.Uint64(raw[8*i:]))
	}
	var out [5][]float64
	for k := range out {
		out[k] = values[1+k*len(z) : 1+(k+1)*len(z)]
	}
	return time.Duration(values[0] * 1e9), out
}

// across are n separations of a transit, a third of them on the limb.
func across(n int) []float64 {
	z := make([]float64, n)
	for i := range z {
		z[i] = 0.3 + 0.8*(float64(i)+0.5)/float64(n)
	}
	return z
}

func TestNumPy(t *testing.T) {
	z := across(500)
	_, want := numpy(t, 0.1, 0.4, 0.3, z)
	g, err := FluxGradient(0.1, z, quadratic(0.4, 0.3), 0)
	if err != nil {
		t.Fatal(err)
	}
	for k, got := range [][]float64{g.Flux, g.ByRadius, g.BySeparation, g.ByCoefficient[0], g.ByCoefficient[1]} {
		for i := range z {
			if math.Abs(got[i]-want[k][i]) > 1e-11 {
				t.Errorf("z = %g: value %d is %.15g, NumPy has %.15g", z[i], k, got[i], want[k][i])
			}
		}
	}
}

// BenchmarkNumPy reports how many times the time NumPy takes for the same fluxes
// and derivatives, the least of 30 calls against the least of many here.
func BenchmarkNumPy(b *testing.B) {
	z := across(10000)
	theirs, _ := numpy(b, 0.1, 0.4, 0.3, z)
	var g Gradient
	ours := time.Hour
	for b.Loop() {
		start := time.Now()
		if err := FluxGradientInto(&g, 0.1, z, quadratic(0.4, 0.3), 0); err != nil {
			b.Fatal(err)
		}
		ours = min(ours, time.Since(start))
	}
	b.ReportMetric(float64(theirs.Nanoseconds())/float64(len(z)), "NumPy-ns/sample")
	b.ReportMetric(float64(ours.Nanoseconds())/float64(len(z)), "ns/sample")
	b.ReportMetric(float64(theirs)/float64(ours), "ratio")
}
