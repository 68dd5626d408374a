package reports

import (
	"math"
	"strings"
	"testing"
	"time"
	"unicode/utf8"
)

func TestVisible(t *testing.T) {
	for in, want := range map[string]string{
		"plain λ\n\t": "plain λ\n\t", "a\r\nb": "a\nb", "a\rb": "a[U+000D]b", "\x00\x1b\x7f": "[U+0000][U+001B][U+007F]", "x\u202ey": "x[U+202E]y",
		"\u200b\ufeff\u00ad": "[U+200B][U+FEFF][U+00AD]", "\xff": "\ufffd", "\U000e0041": "[U+E0041]", "a\u200db": "a\u200db", "\u0085\u2028": "[U+0085][U+2028]",
	} {
		if got := string(visible([]byte(in))); got != want {
			t.Errorf("%q: got %q, want %q", in, got, want)
		}
	}
}

func TestClip(t *testing.T) {
	if got := clip("short", 5); got != "short" {
		t.Error(got)
	}
	if got := clip(strings.Repeat("λ", 1000), 5); got != "λλ… [cut here, 2 kB in all]" || !utf8.ValidString(got) {
		t.Error(got)
	}
}

func TestShortType(t *testing.T) {
	for in, want := range map[string]string{
		"[]rimlight/steps/spectrum.Point": "[]spectrum.Point", "map[string]*a/b/c.D": "map[string]*c.D", "float64": "float64", "func(a/b.C, d/e.F) (g/h.I)": "func(b.C, e.F) (h.I)",
	} {
		if got := shortType(in); got != want {
			t.Errorf("%s: %s", in, got)
		}
	}
}

func TestDuration(t *testing.T) {
	for in, want := range map[time.Duration]string{
		0: "", time.Microsecond: "< 1 ms", 840 * time.Millisecond: "840 ms", 3210 * time.Millisecond: "3.21 s", 47 * time.Second: "47 s", 125 * time.Second: "2 min 05 s", 2 * time.Hour: "2 h 00 min",
	} {
		if got := duration(in); got != want {
			t.Errorf("%s: %q", in, got)
		}
	}
}

func TestMeasured(t *testing.T) {
	for _, c := range []struct {
		value, err float64
		want       string
	}{
		{0.121043, 0.000213, "0.12104 ± 0.00021"}, {2461234.5100213, 0.0000311, "2461234.510021 ± 0.000031"}, {88.431, 0.121, "88.43 ± 0.12"}, {-0.001342, 0.000061, "−0.001342 ± 0.000061"},
		{14523.2, 87.4, "14523 ± 87"}, {14523, 187, "(1.452 ± 0.019)×10⁴"}, {3.1e-9, 4.4e-11, "(3.100 ± 0.044)×10⁻⁹"}, {1, 0.996, "1.0 ± 1.0"}, {1, 0.0996, "1.00 ± 0.10"}, {0, 0.1, "0.00 ± 0.10"},
		{0, 1e-12, "(0.0 ± 1.0)×10⁻¹²"}, {1, 0, "1"}, {1.5, math.NaN(), "1.5"}, {math.NaN(), 1, "NaN"}, {1, math.Inf(1), "1"}, {5e-324, 5e-324, ""}, {1e308, 1e308, ""}, {1e-5, 1e300, ""},
	} {
		if got := measured(c.value, c.err); c.want != "" && got != c.want || strings.Contains(got, "NaN") && !math.IsNaN(c.value) {
			t.Errorf("%g %g: got %s, want %s", c.value, c.err, got, c.want)
		}
	}
}

func TestNumber(t *testing.T) {
	for _, c := range []struct {
		value  float64
		digits int
		padded bool
		want   string
	}{
		{0, 3, false, "0"}, {0.05, 10, false, "0.05"}, {11.2, 6, true, "11.2000"}, {3, 6, true, "3"}, {240000, 6, false, "240000"}, {1.5e-7, 4, false, "1.5×10⁻⁷"}, {4.1e-5, 2, true, "4.1×10⁻⁵"},
		{-2.5e22, 3, false, "−2.5×10²²"}, {math.NaN(), 3, false, "NaN"}, {math.Inf(-1), 3, false, "−∞"}, {0.99999, 3, false, "1"}, {123456, 3, false, "123456"},
	} {
		if got := decimal(c.value, c.digits, c.padded); got != c.want {
			t.Errorf("%g with %d digits: got %s, want %s", c.value, c.digits, got, c.want)
		}
	}
	if got := grouped(1234567) + " " + grouped(1234) + " " + grouped(-12345); got != "1\u202f234\u202f567 1234 -12\u202f345" {
		t.Error(got)
	}
}
