package spectrum

import (
	"bytes"
	"flag"
	"math"
	"os"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// sample is a spectrum with a failed channel, a doubtful one and shared variance.
func sample(t testing.TB) Spectrum {
	t.Helper()
	points := []Point{point(0, 1, 0.0100, 1e-5), failed(1, 1.1, `all samples masked, "dead"`), point(2, 1.2, 1.0/97, 2e-5)}
	points[2].Flag = "limb darkening\nat a bound"
	s, err := Assemble(points, [][]float64{{1e-11, 0, 2e-11}, {0, 0, 0}, {2e-11, 0, 4e-11}})
	if err != nil {
		t.Fatal(err)
	}
	s.Law, s.Policy = "quadratic", "free"
	return s
}

// golden compares got with a file below testdata.
func golden(t *testing.T, name string, got []byte) {
	t.Helper()
	path := "../../testdata/spectrum/" + name
	if *update {
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(got, want) {
		t.Errorf("%s differs; got:\n%s\nwant:\n%s", name, got, want)
	}
}

func TestCSVGolden(t *testing.T) { golden(t, "spectrum.csv", CSV(sample(t))) }

func TestCSVHeader(t *testing.T) {
	line, _, _ := strings.Cut(string(CSV(Spectrum{})), "\n")
	want := "wave_lo,wave_hi,depth,depth_err,radius_ratio,radius_ratio_err,u1,u1_err,u2,u2_err," +
		"chi2_reduced,scatter,samples_used,samples_masked,channel,flag"
	if line != want {
		t.Errorf("header %q, want %q", line, want)
	}
}

func TestReadCSVRoundTrip(t *testing.T) {
	s := sample(t)
	s.Points[0].Limb = []float64{math.NaN(), 0.25}
	written := CSV(s)
	back, err := ReadCSV(written)
	if err != nil {
		t.Fatal(err)
	}
	if again := CSV(back); !bytes.Equal(again, written) {
		t.Errorf("written again:\n%s\nwant:\n%s", again, written)
	}
	if want := s.Errors()[0]; math.Abs(back.Errors()[0]/want-1) > 1e-15 || back.Points[0].DepthErr != want {
		t.Errorf("error %g and %g, want %g", back.Errors()[0], back.Points[0].DepthErr, want)
	}
}

func TestReadCSVOfOthers(t *testing.T) {
	back, err := ReadCSV([]byte("\ufeffname, depth ,depth_err,wave_hi,wave_lo\nx, 0.01,1e-4,2,1\ny,nan,nan,3,2\n"))
	if err != nil {
		t.Fatal(err)
	}
	p := back.Points[0]
	if p.Depth != 0.01 || p.DepthErr != 1e-4 || p.Channel.Lo != 1 || p.Channel.Hi != 2 || !math.IsNaN(p.RadiusRatio) || p.Limb != nil {
		t.Errorf("%+v", p)
	}
	if q := back.Points[1]; q.Good() || q.Channel.Index != 1 || q.Flag != "no depth" {
		t.Errorf("%+v", q)
	}
}

func TestReadCSVRefuses(t *testing.T) {
	const header = "wave_lo,wave_hi,depth,depth_err\n"
	for input, want := range map[string]string{
		"":                                    "the file is empty",
		"wave_lo,wave_hi,depth\n":             "line 1: no column depth_err",
		"wave_lo,wave_lo," + header:           "two columns are named wave_lo",
		header:                                "no points",
		header + "1,2,x,4\n":                  `line 2: column depth: "x"; expected a number or nan`,
		header + "1,2,3\n":                    "wrong number of fields",
		header + "1,2,1,1\n\n0,1,1,1\n":       "line 4: wave_lo 0 is below",
		header + "1,1,1,1\n":                  "expected an interval",
		header + "1,2,1,1\n1,2,1,1\n":         "both reach from 1 to 2 um",
		header + "1,2,1,\"1\n":                "read spectrum: ",
		"flag," + header + "\xe9,1,2,1,1\n":   `column flag: "\xe9"; expected UTF-8 text`,
		"channel," + header + "1.5,1,2,1,1\n": `column channel: "1.5"; expected a whole number`,
	} {
		if _, err := ReadCSV([]byte(input)); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: error %v; want %q", input, err, want)
		}
	}
	long := header + strings.Repeat("1,2,nan,nan\n", MaxPoints+1)
	if _, err := ReadCSV([]byte(long)); err == nil || !strings.Contains(err.Error(), "more than 4096 rows") {
		t.Errorf("more rows than a spectrum has points: error %v", err)
	}
}

func FuzzReadCSV(f *testing.F) {
	f.Add(CSV(sample(f)))
	f.Add([]byte("wave_lo,wave_hi,depth,depth_err,flag\n1,2,3,4,\"a\r\nb\"\n"))
	f.Add([]byte("u2,wave_lo,wave_hi,depth,depth_err\nnan,1,2,inf,4\n"))
	f.Fuzz(func(t *testing.T, data []byte) {
		s, err := ReadCSV(data)
		if err != nil {
			return
		}
		written := CSV(s)
		back, err := ReadCSV(written)
		if err != nil {
			t.Fatalf("%v\n%s", err, written)
		}
		if again := CSV(back); !bytes.Equal(again, written) {
			t.Fatalf("written again:\n%s\nwant:\n%s", again, written)
		}
	})
}
