package reports

import (
	"strings"
	"testing"
)

func TestSummary(t *testing.T) {
	got := map[string]Headline{}
	var order []string
	for _, h := range Summary(sample(80, 300)) {
		got[h.Name] = h
		order = append(order, h.Name)
	}
	for name, want := range map[string]string{
		"outcome": "check failed", "checks": "3 of 4 passed", "channels measured": "78 of 80", "wavelengths": "0.6 to 5.2 µm",
		"white-light radius ratio Rp/Rs": "0.12104 ± 0.00021", "white-light mid-transit time T₀": "2461234.510021 ± 0.000031 d", "white-light reduced χ²": "0.998",
	} {
		if got[name].Text != want {
			t.Errorf("%s: got %q, want %q", name, got[name].Text, want)
		}
	}
	if order[0] != "outcome" || order[1] != "checks" || !got["outcome"].Alert || !got["checks"].Alert || got["channels measured"].Alert {
		t.Error(order, got["outcome"], got["checks"])
	}
	if note := got["checks"].Note; note != "failed: correlated noise over 20 minutes" {
		t.Error(note)
	}
	if m := got["masked samples"]; !strings.Contains(m.Note, "missing") || !strings.Contains(m.Note, "of 24\u202f000 samples") {
		t.Error(m)
	}
	if s := Summary(Document{}); len(s) != 1 {
		t.Error(s)
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
