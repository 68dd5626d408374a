package recipe

import (
	"reflect"
	"strings"
	"testing"

	"rimlight/steps/fit"
)

// priorsOf parses a parameter table of the given rows.
func priorsOf(t *testing.T, rows ...string) ([]Prior, error) {
	t.Helper()
	source := "# T\n| setting | value | unit | about |\n|-|-|-|-|\n| t0 | 10 | | |\n| sd | 0.5 | | |\n\n" +
		"| parameter | prior | unit | about |\n|-|-|-|-|\n" + strings.Join(rows, "\n") + "\n"
	r, diags := Parse("r.md", []byte(source))
	return r.Sections[1].Priors, diags.Err()
}

func TestResolve(t *testing.T) {
	priors, err := priorsOf(t,
		"| z | U(t0, 20) | d | |", "| a | U(t0 - 0.5, t0+0.5) | | |", "| b | N(1, sd) | | |", "| c | TN( 1,2 , -3, 4e0) | | |", "| d | logU(1e-3,1) | | |", "| e |=t0 | | |", "| f | = -2 | | |")
	if err == nil || !strings.Contains(err.Error(), "r.md:9:9: the setting t0 is a pure number, the prior of z in d") {
		t.Errorf("units are not compared: %v", err)
	}
	settings := map[string]float64{"t0": 10, "sd": 0.5}
	got, diags := Resolve(priors, func(name string) (float64, bool) { x, ok := settings[name]; return x, ok })
	want := fit.Priors{
		{Name: "a", Kind: fit.Uniform, A: 9.5, B: 10.5},
		{Name: "b", Kind: fit.Normal, A: 1, B: 0.5},
		{Name: "c", Kind: fit.TruncatedNormal, A: 1, B: 2, Lo: -3, Hi: 4},
		{Name: "d", Kind: fit.LogUniform, A: 1e-3, B: 1},
		{Name: "e", Kind: fit.Fixed, A: 10},
		{Name: "f", Kind: fit.Fixed, A: -2},
	}
	if len(diags) > 0 || !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v, %v\nwant %+v", got, diags, want)
	}
}

func TestResolveFaults(t *testing.T) {
	priors, err := priorsOf(t, "| a | U(0, t0) | | |", "| b | N(0, sd) | | |", "| c | logU(sd, 1) | | |", "| d | = t0 | | |", "| e | = t0 + 1e308 | | |", "| f | TN(0, 1, sd, 2) | | |")
	if err != nil {
		t.Fatal(err)
	}
	settings := map[string]float64{"t0": -1.7e308, "sd": -1}
	got, diags := Resolve(priors[:4], func(name string) (float64, bool) { x, ok := settings[name]; return x, ok })
	const want = `r.md:9:7: the prior of a is not right with the settings filled in: its upper end is not above its lower end; expected U(a, b) with a < b
r.md:10:7: the prior of b is not right with the settings filled in: its standard deviation is not above zero; expected N(mean, sd) with sd > 0
r.md:11:7: the prior of c is not right with the settings filled in: its lower end is not above zero; expected logU(a, b) with 0 < a < b`
	if diags.Error() != want || len(got) != 1 || got[0].Name != "d" {
		t.Errorf("got %v and\n%v\nwant\n%s", got, diags, want)
	}
	delete(settings, "sd")
	settings["t0"] = 1.7e308
	_, diags = Resolve(priors[4:], func(name string) (float64, bool) { x, ok := settings[name]; return x, ok })
	const want2 = `r.md:13:9: the setting t0 takes the prior of e out of the range of numbers; expected a finite number
r.md:14:16: the setting sd is no number; expected the name of a setting that is a number`
	if diags.Error() != want2 {
		t.Errorf("got\n%v\nwant\n%s", diags, want2)
	}
}

func TestReadTerm(t *testing.T) {
	for s, want := range map[string]Term{
		"0.05": {Offset: 0.05}, "-1e-3": {Offset: -1e-3}, "t0": {Setting: "t0"}, "t0+1": {Setting: "t0", Offset: 1},
		"t0 - .5": {Setting: "t0", Offset: -0.5}, "my_x -2e-2": {Setting: "my_x", Offset: -0.02}, "e5": {Setting: "e5"},
	} {
		if got, err := readTerm(s); err != nil || got != want {
			t.Errorf("%q: got %+v, %v; want %+v", s, got, err, want)
		}
	}
	for _, s := range []string{"", "1 + t0", "t0 t1", "t0 +", "t0 + t1", "t0 - -1", "t0 * 2", "inf", "1e999", "t0 + nan", "\u22121", "t0 \u2212 1", "5 d", "2t", "t.0"} {
		if got, err := readTerm(s); err == nil {
			t.Errorf("%q is accepted as %+v", s, got)
		}
	}
}

func FuzzPrior(f *testing.F) {
	for _, s := range []string{"U(0.05, 0.15)", "N(t0, sd)", "TN(1,2,-3,4)", "logU(1e-3, 1)", "= t0 - 0.02", "U(", "=", "Normal(0, 1)", "U(t0 \u2212 1, t0)", "`U(0, 1)`", `U(0\, 1)`} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		if strings.ContainsAny(s, "|\n\r") {
			return
		}
		priors, err := priorsOf(t, "| x | "+s+" | | |")
		if err != nil || len(priors) == 0 {
			return
		}
		kind, ok := priorKindOf(priors[0].Kind)
		if !ok || len(priors[0].Terms) != kind.args {
			t.Errorf("%q is read as %+v", s, priors[0])
		}
	})
}
