package command

import (
	"bytes"
	"path/filepath"
	"strings"
	"testing"

	"rimlight/runner/store"
)

func TestWhy(t *testing.T) {
	b := newBench(t, arithmetic)
	b.run(ExitDone)
	for _, c := range []struct {
		args []string
		want []string
	}{
		{[]string{"check", "--why", "Square", "--set", "offset=2"}, []string{"Square, element 1 of 12", "setting offset changed, against", "- setting offset float64 0.5", "+ setting offset float64 2", "  step Square"}},
		{[]string{"check", "--why", "Square:3"}, []string{"Square, element 3 of 12", "nothing changed", "element value"}},
		{[]string{"check", "--why", "Sum", "--set", "offset=2"}, []string{"not known before what it takes is computed"}},
		{[]string{"run", "--why", "Sum", "--set", "offset=2"}, []string{"result squared changed, against", "- result squared []float64", "+ result squared []float64"}},
	} {
		var out, errs bytes.Buffer
		args := append([]string{c.args[0], filepath.Join(b.dir, "r.md")}, c.args[1:]...)
		if status := Run(args, &out, &errs); status != ExitDone {
			t.Errorf("%v: exit status %d: %s", c.args, status, errs.String())
		}
		for _, w := range c.want {
			if !strings.Contains(out.String(), w) {
				t.Errorf("%v: %q is not in\n%s", c.args, w, out.String())
			}
		}
	}
	for _, name := range []string{"Sqare", "Square:0", "Square:13", "Sum:2", "Square:x"} {
		var out, errs bytes.Buffer
		if status := Run([]string{"check", filepath.Join(b.dir, "r.md"), "--why", name}, &out, &errs); status != ExitWrong {
			t.Errorf("--why %s: exit status %d: %s", name, status, errs.String())
		}
	}
}

func TestAgain(t *testing.T) {
	b := newBench(t, arithmetic)
	first, _ := b.run(ExitDone)
	r, said := b.run(ExitDone, "--again", "Sum", "--again", "Square")
	if got := reasons(r); got != "Square: asked for again; Sum: asked for again" {
		t.Errorf("computed %q", got)
	}
	if strings.Count(said, "the same bytes") != 2 || hashes(r) != hashes(first) {
		t.Errorf("it said\n%s", said)
	}
	b.run(ExitWrong, "--again", "Smu")

	// A record that claims another result, as a step that is not reproducible
	// would have left it.
	s, err := store.Open(filepath.Join(b.dir, "rimlight.store"))
	if err != nil {
		t.Fatal(err)
	}
	var key, drawn store.Key
	for _, step := range first.Steps {
		switch step.Name {
		case "Sum":
			key, err = store.ParseKey(step.Key)
		case "Name":
			drawn, _ = store.ParseKey(step.Key)
		}
	}
	if err != nil {
		t.Fatal(err)
	}
	record, _, _ := s.Record(key)
	other, _, _ := s.Record(drawn)
	record.Results[0].Hash = other.Results[0].Hash
	if err := s.Remove(key); err != nil {
		t.Fatal(err)
	}
	if err := s.SetRecord(record); err != nil {
		t.Fatal(err)
	}
	_, said = b.run(ExitCheckFailed, "--again", "Sum")
	if !strings.Contains(said, "not reproducible") {
		t.Errorf("it said\n%s", said)
	}
}
