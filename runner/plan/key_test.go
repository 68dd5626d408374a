package plan

import (
	"math"
	"slices"
	"strings"
	"testing"

	"rimlight/runner/program"
	"rimlight/steps/fit"
)

// sample is a step with an argument of every source, and the hashes of its
// arguments.
func sample() (*Step, []string) {
	return &Step{
		Step: program.Step{Name: "Fit", CodeHash: "c0de", Packages: []string{"rimlight/steps/transit"}},
		Args: []Arg{
			{Name: "raw", Type: "rimlight/steps/lightcurve.Cube", Source: FromInput},
			{Name: "white", Type: "float64", Source: FromResult},
			{Name: "channel", Type: "int", Source: FromElement},
			{Name: "clipSigma", Type: "float64", Source: FromSetting, Value: 5.0},
			{Name: "regressors", Type: "[]string", Source: FromSetting, Value: []string{"X", "Y"}},
			{Name: "priors", Type: "rimlight/steps/fit.Priors", Source: FromPriors, Value: fit.Priors{{Name: "radiusRatio", Kind: "U", A: 0.05, B: 0.15}}},
			{Name: "seed", Type: "uint64", Source: FromSeed},
		},
	}, []string{"aaaa", "bbbb", "eeee", "", "", "", ""}
}

func sampleLibrary() *Library {
	return &Library{
		hash:    map[string]string{"rimlight/steps/transit": "11", "rimlight/steps/orbit": "22", "rimlight/steps/figure": "33"},
		imports: map[string][]string{"rimlight/steps/transit": {"rimlight/steps/orbit"}},
	}
}

// TestKeySeesEverything changes one ingredient of a key at a time and demands
// a new key and the right reason for it.
func TestKeySeesEverything(t *testing.T) {
	build := Build{Go: "go1.26", Arch: "amd64", Settings: []string{"GOAMD64=v1"}, Modules: []Module{{"gonum.org/v1/gonum", "v0.17.0", "h1:x"}}}
	for _, c := range []struct {
		why    string
		change func(s *Step, hashes []string, lib *Library, b *Build)
	}{
		{"", func(s *Step, h []string, lib *Library, b *Build) {}},
		{"", func(s *Step, h []string, lib *Library, b *Build) { lib.hash["rimlight/steps/figure"] = "99" }}, // not reached
		{"", func(s *Step, h []string, lib *Library, b *Build) { b.Version, b.Revision = "v9", "f00" }},      // not an influence
		{"code changed", func(s *Step, h []string, lib *Library, b *Build) { s.CodeHash = "beef" }},
		{"input raw changed", func(s *Step, h []string, lib *Library, b *Build) { h[0] = "ffff" }},
		{"result white changed", func(s *Step, h []string, lib *Library, b *Build) { h[1] = "ffff" }},
		{"element channel changed", func(s *Step, h []string, lib *Library, b *Build) { h[2] = "ffff" }},
		{"setting clipSigma changed", func(s *Step, h []string, lib *Library, b *Build) { s.Args[3].Value = 4.0 }},
		{"setting regressors changed", func(s *Step, h []string, lib *Library, b *Build) { s.Args[4].Value = []string{"X Y"} }},
		{"prior of radiusRatio changed", func(s *Step, h []string, lib *Library, b *Build) {
			s.Args[5].Value = fit.Priors{{Name: "radiusRatio", Kind: "U", A: 0.05, B: 0.16}}
		}},
		{"library changed: steps/transit", func(s *Step, h []string, lib *Library, b *Build) { lib.hash["rimlight/steps/transit"] = "99" }},
		{"library changed: steps/orbit", func(s *Step, h []string, lib *Library, b *Build) { lib.hash["rimlight/steps/orbit"] = "99" }},
		{"module changed: gonum.org/v1/gonum", func(s *Step, h []string, lib *Library, b *Build) {
			b.Modules = []Module{{"gonum.org/v1/gonum", "v0.18.0", "h1:y"}}
		}},
		{"program changed: go", func(s *Step, h []string, lib *Library, b *Build) { b.Go = "go1.27" }},
		{"program changed: setting GOAMD64", func(s *Step, h []string, lib *Library, b *Build) { b.Settings = []string{"GOAMD64=v3"} }},
		{"program changed: arch", func(s *Step, h []string, lib *Library, b *Build) { b.Arch = "arm64" }},
		{"code changed, setting clipSigma changed", func(s *Step, h []string, lib *Library, b *Build) { s.CodeHash, s.Args[3].Value = "beef", 4.0 }},
	} {
		s, h := sample()
		first := StepKey(s, h, sampleLibrary(), build)
		s, h = sample()
		lib, b := sampleLibrary(), build
		c.change(s, h, lib, &b)
		second := StepKey(s, h, lib, b)
		if why := second.Why(first); why != c.why {
			t.Errorf("got the reason %q, want %q", why, c.why)
		}
		if same := first.Key() == second.Key(); same != (c.why == "") {
			t.Errorf("%s: keys equal: %v", c.why, same)
		}
	}
	s, h := sample()
	if why := StepKey(s, h, sampleLibrary(), build).Why(""); why != "first time" {
		t.Errorf("got the reason %q, want first time", why)
	}
}

// TestSpellIsUnambiguous holds that different values never share a spelling.
func TestSpellIsUnambiguous(t *testing.T) {
	values := []any{1.0, 1.5, 0.1, math.Nextafter(0.3, 1), 0.3, "1", "a, b", []string{"a, b"}, []string{"a", "b"}, []string{"a\", \"b"}, []float64{1, 2}, []float64{12}, true, "true", 1e300}
	seen := map[string]any{}
	for _, v := range values {
		s := spell(v)
		if w, taken := seen[s]; taken {
			t.Errorf("%#v and %#v are both spelled %s", v, w, s)
		}
		if strings.Contains(s, "\n") {
			t.Errorf("%#v is spelled over several lines", v)
		}
		seen[s] = v
	}
}

func TestDiff(t *testing.T) {
	before := KeyText("rimlight key 1\nstep Fit\ncode aa\nsetting clipSigma float64 5\nsetting gone bool true\nlibrary p 11\nprogram setting GOAMD64=v1\nprogram setting GOEXPERIMENT=x\n")
	now := KeyText("rimlight key 1\nstep Fit\ncode aa\nsetting clipSigma float64 4\nsetting new int 1\nlibrary p 11\nprogram setting GOAMD64=v1\nprogram setting GOEXPERIMENT=y\n")
	var got []string
	for _, l := range now.Diff(before) {
		got = append(got, string(l.Mark)+l.Text)
	}
	want := []string{" rimlight key 1", " step Fit", " code aa", "-setting clipSigma float64 5", "+setting clipSigma float64 4", "+setting new int 1", " library p 11",
		" program setting GOAMD64=v1", "-program setting GOEXPERIMENT=x", "+program setting GOEXPERIMENT=y", "-setting gone bool true"}
	if !slices.Equal(got, want) {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
	for _, l := range now.Diff("") {
		if l.Mark != ' ' {
			t.Errorf("without a run before, %q is marked %q", l.Text, l.Mark)
		}
	}
}

func TestSeedIsNeverZero(t *testing.T) {
	a, b := KeyText("a").Seed(), KeyText("b").Seed()
	if a == 0 || b == 0 || a == b {
		t.Errorf("seeds %d and %d", a, b)
	}
}
