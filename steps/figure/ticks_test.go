package figure

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

// labels joins the labels of ticks.
func labels(ticks []tick) string {
	var out []string
	for _, t := range ticks {
		if t.label != "" {
			out = append(out, t.label)
		}
	}
	return strings.Join(out, " ")
}

func TestTicks(t *testing.T) {
	for _, tc := range []struct {
		span  span
		count int
		want  string
	}{
		{newSpan(0, 1), 5, "0 0.2 0.4 0.6 0.8 1.0"},
		{newSpan(-3, 3), 6, "−3 −2 −1 0 1 2 3"},
		{newSpan(0.6, 5.2), 10, "1.0 1.5 2.0 2.5 3.0 3.5 4.0 4.5 5.0"},
		{newSpan(13900, 14850), 7, "14000 14200 14400 14600 14800"},
		{newSpan(0.98437, 1.0004), 5, "0.985 0.990 0.995 1.000"},
		{newSpan(0.99996, 1.00004), 4, "0.99996 0.99998 1.00000 1.00002 1.00004"},
		{newSpan(0, 3e7), 3, "0 1e+07 2e+07 3e+07"},
		{newSpan(-4e-9, 4e-9), 2, "−4e−09 −2e−09 0 2e−09 4e−09"},
		{newSpan(2460098.45, 2460101), 3, "2460099 2460100 2460101"},
		{newLogSpan(0.1, 40), 5, "0.1 1 10"},
		{newLogSpan(90, 420), 5, "100 200"},
		{newLogSpan(1, 1e9), 4, "1 1000 1e+06 1e+09"},
		{newLogSpan(30, 45), 4, "30 35 40 45"},
	} {
		if got := labels(tc.span.ticks(tc.count)); got != tc.want {
			t.Errorf("%+v, %d: %s; want %s", tc.span, tc.count, got, tc.want)
		}
	}
}

func TestSpans(t *testing.T) {
	inf := math.Inf(1)
	for _, s := range []span{
		newSpan(nan, nan), newSpan(1, nan), newSpan(5, 4), newSpan(-inf, inf), newSpan(0, 0), newSpan(3, 3), newSpan(-2e-310, -2e-310),
		newSpan(1e308, math.MaxFloat64), newSpan(1, 1+1e-15), newLogSpan(nan, nan), newLogSpan(0, 1), newLogSpan(-1, 1), newLogSpan(7, 7), newLogSpan(1e-300, inf),
	} {
		if !(s.lo < s.hi) || !finite(s.lo) || !finite(s.hi) || !finite(s.hi-s.lo) || s.log && s.lo <= 0 {
			t.Errorf("%+v is no range", s)
		}
		checkTicks(t, s, 5)
	}
	if s := newSpan(2, 4).padded(0.5, 1); s.lo != 1 || s.hi != 6 {
		t.Errorf("padded %+v", s)
	}
	if s := newLogSpan(10, 1000).padded(0.5, 0); math.Abs(s.lo-1) > 1e-12 || math.Abs(s.hi-1000) > 1e-9 {
		t.Errorf("padded %+v", s)
	}
	if x := newLogSpan(1, 100).at(10); math.Abs(x-0.5) > 1e-15 {
		t.Errorf("10 lies at %g", x)
	}
}

// checkTicks holds what must be true of the marks of any axis.
func checkTicks(t *testing.T, s span, count int) {
	t.Helper()
	ticks := s.ticks(count)
	if len(ticks) > 100+40*count {
		t.Fatalf("%+v: %d marks", s, len(ticks))
	}
	last := math.Inf(-1)
	for _, m := range ticks {
		at := s.at(m.value)
		if !(at >= -1e-6 && at <= 1+1e-6) || !(m.value > last) {
			t.Fatalf("%+v: mark %+v at %g, after %g", s, m, at, last)
		}
		if strings.Contains(m.label, "-") || strings.Contains(m.label, "NaN") || strings.Contains(m.label, "Inf") {
			t.Fatalf("%+v: label %q", s, m.label)
		}
		last = m.value
	}
	seen := map[string]bool{}
	for _, m := range ticks {
		if m.label != "" && seen[m.label] {
			t.Fatalf("%+v: two marks are labelled %q", s, m.label)
		}
		seen[m.label] = true
	}
}

func FuzzTicks(f *testing.F) {
	f.Add(0.0, 1.0, uint8(5), false)
	f.Add(1e-9, 1.00000001e-9, uint8(3), true)
	f.Add(-1e300, 1e308, uint8(9), false)
	f.Add(2460123.45, 2460123.4500001, uint8(9), false)
	f.Fuzz(func(t *testing.T, lo, hi float64, count uint8, log bool) {
		s := newSpan(lo, hi)
		if log {
			s = newLogSpan(lo, hi)
		}
		checkTicks(t, s, int(count%12)+1)
	})
}

func TestDecimal(t *testing.T) {
	for want, got := range map[string]string{
		"0": decimal(-1e-17, -2), "0.10": decimal(0.1, -2), "−0.5": decimal(-0.5, -1), "1200": decimal(1200, 2), "2e−07": decimal(2e-7, -7),
	} {
		if got != want {
			t.Errorf("%s, want %s", got, want)
		}
	}
	if got := fmt.Sprint(decimal(1e6, 6)); got != "1e+06" {
		t.Error(got)
	}
}
