package command

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"rimlight/recipes"
	"rimlight/steps/lightcurve"
	"rimlight/steps/simulate"
	"rimlight/steps/spectrum"
)

// flagged is arithmetic with squares that can say that they are none: element
// 7 fails, and the sum leaves gaps out.
var flagged = strings.NewReplacer(
	"type pair struct {", "type area struct {\n\tIndex int\n\tSize  float64\n\tFlag  string\n}\n\ntype pair struct {",
	"(squared float64, err error) {\n\tsquared = square(value.Value) + offset",
	"(squared area, name string, err error) {\n\tif value.Index == 7 {\n\t\terr = errors.New(\"seven is out\")\n\t\treturn\n\t}\n\tsquared = area{Index: value.Index, Size: square(value.Value) + offset}\n\tname = \"a\"",
	"func Sum(squared []float64) (sum float64) {\n\tfor _, s := range squared {\n\t\tsum += s\n\t}",
	"func Sum(squared []area, name []string) (sum float64, gap area, names string) {\n\tfor i, s := range squared {\n\t\tnames += name[i]\n\t\tif s.Flag != \"\" {\n\t\t\tgap = s\n\t\t\tcontinue\n\t\t}\n\t\tsum += s.Size\n\t}",
).Replace(arithmetic)

// TestGap holds that an element that fails leaves a gap where the step can flag
// it: the run goes on, says so, ends with the status of a failed check, and
// tries the element again the next time.
func TestGap(t *testing.T) {
	b := newBench(t, flagged)
	r, said := b.run(ExitCheckFailed)
	for _, want := range []string{"1 of 12 elements has no result (8)", "seven is out", "elements of Square without a result, of 12 is 1"} {
		if !strings.Contains(said, want) {
			t.Errorf("it did not say %q but\n%s", want, said)
		}
	}
	if r.Outcome != "check failed" || len(r.Checks) != 1 || r.Checks[0].Passed || r.Checks[0].Step != "Square" {
		t.Errorf("outcome %q, checks %+v", r.Outcome, r.Checks)
	}
	if el := r.Steps[1].Elements[7]; el.State != "failed" || !strings.Contains(el.Error, "seven is out") {
		t.Errorf("element 8 is %+v", el)
	}
	if got := r.Steps[2].State; got != "computed" {
		t.Errorf("what comes after the gap is %s", got)
	}
	page, err := os.ReadFile(filepath.Join(b.dir, "r.out", reportFile))
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"Element 8 failed", "seven is out", "462.5"} { // 506 - 49 + 11/2
		if !strings.Contains(string(page), want) {
			t.Errorf("the report does not have %q", want)
		}
	}

	// The next run tries the one element again and uses all else.
	again, _ := b.run(ExitCheckFailed)
	if got := reasons(again); !strings.HasPrefix(got, "Square: ") || strings.Contains(got, "Sum") {
		t.Errorf("the second run was %q", got)
	}
	if hashes(again) != hashes(r) {
		t.Errorf("the results of the second run differ:\n%s\n%s", hashes(r), hashes(again))
	}

	// Asked for, the failure is one of the step.
	r, said = b.run(ExitFailed, "--no-gaps")
	if r.Outcome != "step failed" || !strings.Contains(said, "1 of 12 elements failed; element 8:") {
		t.Errorf("with --no-gaps the outcome is %q; it said\n%s", r.Outcome, said)
	}

	// Repaired, there is no gap, and nothing of it is left.
	b.write(strings.Replace(flagged, "value.Index == 7", "value.Index == 70", 1))
	r, _ = b.run(ExitDone)
	if len(r.Checks) > 0 || r.Steps[1].Elements[7].State != "computed" {
		t.Errorf("after the repair: checks %+v, element 8 %+v", r.Checks, r.Steps[1].Elements[7])
	}
}

// TestGapImpossible holds that a step fails as a whole when nothing in its
// results could say that there is a gap, and when there are only gaps.
func TestGapImpossible(t *testing.T) {
	for want, recipe := range map[string]string{
		"they leave no gaps": strings.Replace(arithmetic, "squared = square(value.Value) + offset",
			"if value.Index == 7 {\n\t\terr = errors.New(\"seven is out\")\n\t\treturn\n\t}\n\tsquared = square(value.Value) + offset", 1),
		"12 of 12 elements failed; element 1: ": strings.Replace(flagged, "value.Index == 7", "value.Index >= 0", 1),
	} {
		b := newBench(t, recipe)
		if r, said := b.run(ExitFailed); !strings.Contains(said, want) || r.Steps[2].State != "not reached" {
			t.Errorf("it did not say %q but\n%s", want, said)
		}
	}
}

// TestGapOfDeaths holds that an element that costs its worker its life leaves a
// gap, and that a fan-out with too many of them says what it left alone.
func TestGapOfDeaths(t *testing.T) {
	if racing {
		t.Skip("the race detector needs the memory")
	}
	dying := strings.Replace(flagged, "err = errors.New(\"seven is out\")\n\t\treturn", "for value.Index > 0 {\n\t\t\toffset += 1\n\t\t}", 1)
	b := newBench(t, dying)
	r, said := b.run(ExitCheckFailed, "--step-time", "1s")
	if !strings.Contains(said, "1 of 12 elements has no result (8); element 8: stopped after 1s") || r.Steps[2].State != "computed" {
		t.Errorf("with one endless element it said\n%s", said)
	}
	b.write(strings.Replace(dying, "value.Index == 7", "value.Index >= 2", 1))
	r, said = b.run(ExitFailed, "--step-time", "300ms", "--jobs", "1")
	if !strings.Contains(said, "4 of 12 elements failed") || !strings.Contains(said, "the rest, 7 to 12, was not tried; element 3: stopped after") {
		t.Errorf("with ten endless elements it said\n%s", said)
	}
	if el := r.Steps[1].Elements[11]; el.State != "not reached" {
		t.Errorf("the last element is %+v", el)
	}
}

// TestGapInSpectrum runs the shipped recipe on data of which one channel cannot
// be fitted, and holds that its place, with its edges, is in the spectrum.
func TestGapInSpectrum(t *testing.T) {
	if testing.Short() {
		t.Skip("takes a few seconds")
	}
	scenario := simulate.Continuous(3)
	scenario.Integrations, scenario.Channels, scenario.Cadence, scenario.DeadChannels = 500, 12, 49, 1
	cube, _, err := simulate.Make(scenario)
	if err != nil {
		t.Fatal(err)
	}
	raw, err := lightcurve.WriteFITS(cube)
	if err != nil {
		t.Fatal(err)
	}
	const fitting = "\tpoint, fitted, err := fit.Channel(channel, geometry, channelModel)\n"
	recipe := strings.Replace(string(recipes.Continuous()), fitting,
		"\tif channel.Channel.Index == 5 {\n\t\terr = errors.New(\"made to fail\")\n\t\treturn\n\t}\n"+fitting, 1)
	b := newBench(t, recipe)
	if err := os.WriteFile(filepath.Join(b.dir, "visit.fits"), raw, 0o644); err != nil {
		t.Fatal(err)
	}
	r, said := b.run(ExitCheckFailed)
	if !strings.Contains(said, "1 of 12 elements has no result") {
		t.Errorf("it said\n%s", said)
	}
	for _, s := range r.Steps {
		if s.State != "computed" {
			t.Errorf("step %s is %s: %s", s.Name, s.State, s.Error)
		}
	}
	for _, c := range r.Checks {
		if failed := c.Step == "FitChannel"; c.Passed == failed {
			t.Errorf("check %+v", c)
		}
	}
	csv, err := os.ReadFile(filepath.Join(b.dir, "r.out", csvFile))
	if err != nil {
		t.Fatal(err)
	}
	s, err := spectrum.ReadCSV(csv)
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Points) != 12 {
		t.Fatalf("the spectrum has %d points", len(s.Points))
	}
	for i, p := range s.Points {
		want := cube.Channels[i]
		if math.Abs(p.Channel.Lo-want.Lo) > 1e-9 || math.Abs(p.Channel.Hi-want.Hi) > 1e-9 || p.Channel.Index != want.Index {
			t.Errorf("point %d is of channel %+v, expected %+v", i, p.Channel, want)
		}
		if made := i == 5; made && (p.Good() || p.Flag != "made to fail" || !math.IsNaN(p.Depth) || !math.IsNaN(p.DepthErr)) {
			t.Errorf("the point of the channel that failed is %+v", p)
		}
	}
	ecsv, err := os.ReadFile(filepath.Join(b.dir, "r.out", ecsvFile))
	if err != nil || !strings.Contains(string(ecsv), "made to fail") {
		t.Errorf("the gap is not in %s: %v", ecsvFile, err)
	}
	page, err := os.ReadFile(filepath.Join(b.dir, "r.out", reportFile))
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"no depth: made to fail", "made to fail</pre>"} {
		if !strings.Contains(string(page), want) {
			t.Errorf("the report does not have %q", want)
		}
	}
	if strings.Contains(string(page), ">NaN<") {
		t.Error("the report shows NaN")
	}
}
