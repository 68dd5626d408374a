package spectrum

import (
	"math"
	"strings"
	"testing"

	"rimlight/steps/lightcurve"
)

// TestGap holds that a point of which only the channel and the reason are known
// keeps its place in a spectrum and in its files, and has no part in its numbers.
func TestGap(t *testing.T) {
	nan := math.NaN()
	gap := Point{Channel: lightcurve.Channel{Index: 1, Lo: 1.1, Hi: 1.2}, Depth: nan, DepthErr: nan, RadiusRatio: nan, RadiusRatioErr: nan,
		Chi2: nan, Scatter: nan, Flag: "out of memory: more than 2GiB were needed"}
	a, b := point(0, 1.0, 0.0100, 1e-5), point(2, 1.2, 0.0102, 2e-5)
	shared := [][]float64{{1e-10, 0, 1e-10}, {0, 0, 0}, {1e-10, 0, 1e-10}}
	s, err := Assemble([]Point{a, gap, b}, shared)
	if err != nil {
		t.Fatal(err)
	}
	without, err := Assemble([]Point{a, b}, [][]float64{{1e-10, 1e-10}, {1e-10, 1e-10}})
	if err != nil {
		t.Fatal(err)
	}
	got, want := s.Summary(), without.Summary()
	want.Channels, want.Flagged = 3, 1
	if got != want {
		t.Errorf("the summary is %+v, expected %+v", got, want)
	}
	for name, data := range map[string][]byte{"CSV": CSV(s), "ECSV": mustECSV(t, s)} {
		if !strings.Contains(string(data), gap.Flag) {
			t.Errorf("the %s does not say why there is a gap", name)
		}
	}
	back, err := ReadCSV(CSV(s))
	if err != nil {
		t.Fatal(err)
	}
	if p := back.Points[1]; p.Channel != gap.Channel || p.Flag != gap.Flag || p.Good() || len(p.Limb) > 0 {
		t.Errorf("the gap is read back as %+v", p)
	}
}

func mustECSV(t *testing.T, s Spectrum) []byte {
	t.Helper()
	b, err := ECSV(s, nil)
	if err != nil {
		t.Fatal(err)
	}
	return b
}
