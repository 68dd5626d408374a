package reports

import (
	"strings"
	"testing"
)

func TestHeadlines(t *testing.T) {
	d := sample(80, 300)
	got := map[string]Headline{}
	for _, h := range Headlines(d) {
		got[h.Label] = h
	}
	for label, want := range map[string]string{
		"channels measured": "78 of 80", "wavelengths": "0.6 to 5.2 µm", "white-light radius ratio Rp/Rs": "0.12104 ± 0.00021",
		"white-light mid-transit time T₀": "2461234.510021 ± 0.000031 d", "white-light reduced χ²": "0.998",
	} {
		if got[label].Value != want {
			t.Errorf("%s: got %q, want %q", label, got[label].Value, want)
		}
	}
	if m := got["masked samples"]; !strings.Contains(m.Note, "missing") || !strings.Contains(m.Note, "of 24\u202f000 samples") {
		t.Error(m)
	}
	if h := checksHeadline(verdicts(d)); h.Value != "3 of 4 passed" || h.Note != "failed: correlated noise over 20 minutes" || !h.Alert {
		t.Error(h)
	}
	if s := stepCounts(d); s != "6 steps: 4 computed, 2 reused" {
		t.Error(s)
	}
	if h := Headlines(Document{}); len(h) != 0 {
		t.Error(h)
	}
}

func TestSpectrumFigure(t *testing.T) {
	d := sample(8, 20)
	f, at, ok := spectrumFigure(d)
	if !ok || f.Title != "Transmission spectrum" || at != (place{4, 1}) {
		t.Error(f.Title, at)
	}
	d.Steps = d.Steps[:3]
	if f, _, ok := spectrumFigure(d); ok {
		t.Error(f.Title)
	}
}
