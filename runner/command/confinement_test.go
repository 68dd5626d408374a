package command

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"rimlight/runner/confine"
)

func TestSize(t *testing.T) {
	for text, want := range map[string]size{"512MiB": 512 << 20, "2GiB": 2 << 30, "2 gib": 2 << 30, "1.5GiB": 3 << 29, "300MB": 300e6, "1048576": 1 << 20, "0": 0} {
		var s size
		if err := s.Set(text); err != nil || s != want {
			t.Errorf("%q: got %d, %v; want %d", text, s, err, want)
		}
	}
	for _, text := range []string{"", "GiB", "-1GiB", "2GiBB", "1e30", "NaN", "Inf", "two"} {
		var s size
		if err := s.Set(text); err == nil {
			t.Errorf("%q was taken as %d", text, s)
		}
	}
	s := size(2 << 30)
	if s.String() != "2GiB" {
		t.Errorf("2 GiB is written %q", s.String())
	}
}

// TestLimitFlags holds that limits nothing could work under are refused before
// anything is run.
func TestLimitFlags(t *testing.T) {
	for _, c := range []struct{ flag, want string }{
		{"--step-time=1ms", "--step-time 1ms: expected at least 100ms"},
		{"--step-memory=1MiB", "--step-memory 1 MiB: expected at least 128 MiB"},
		{"--step-memory=lots", "expected a size such as 512MiB or 2GiB"},
	} {
		b := newBench(t, arithmetic)
		if _, said := b.run(ExitWrong, c.flag); !strings.Contains(said, c.want) {
			t.Errorf("%s: it said %q, expected %q", c.flag, said, c.want)
		}
	}
}

// TestConfinementIsTold holds that command, record and report say what steps
// were confined by.
func TestConfinementIsTold(t *testing.T) {
	b := newBench(t, arithmetic)
	r, said := b.run(ExitDone, "--step-time", "1m", "--step-memory", "512MiB")
	if len(r.Host.Confinement) < 8 || r.Limits.StepSeconds != 60 || r.Limits.StepMemory != 512<<20 {
		t.Errorf("the record says %+v, %+v", r.Host.Confinement, r.Limits)
	}
	report, err := os.ReadFile(filepath.Join(b.dir, "r.out", reportFile))
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range r.Host.Confinement {
		if !strings.Contains(said, l.Name) {
			t.Errorf("layer %s was not told", l.Name)
		}
		if !bytes.Contains(report, []byte(l.Name)) {
			t.Errorf("layer %s is not in the report", l.Name)
		}
	}
	if _, said = b.run(ExitDone, "--json"); !strings.Contains(said, `"event":"confinement"`) {
		t.Errorf("no event for programs: %s", said)
	}
}

// TestMissingConfinementIsTold does so for layers that are missing.
func TestMissingConfinementIsTold(t *testing.T) {
	report := confine.Report{{Name: "seccomp", Active: true}, {Name: "Landlock", Detail: "the kernel has none"}}
	var out, errs bytes.Buffer
	a := &app{stdout: &out, stderr: &errs}
	a.showConfinement(&options{confined: report})
	const want = "warning: steps are not confined by Landlock: the kernel has none\nsteps are confined by seccomp\n"
	if errs.String() != want {
		t.Errorf("it said %q, expected %q", errs.String(), want)
	}
	a.showConfinement(&options{confined: report, json: true})
	const event = `{"active":["seccomp"],"event":"confinement","missing":{"Landlock":"the kernel has none"}}` + "\n"
	if out.String() != event {
		t.Errorf("it said %q, expected %q", out.String(), event)
	}
	if got := strings.Join(confinement(report), "; "); got != "seccomp; not by Landlock (the kernel has none)" {
		t.Errorf("the report says %q", got)
	}
}

// TestRequireConfinement holds that the flag changes nothing where everything
// is there, and where it is not, names what is missing and runs nothing.
func TestRequireConfinement(t *testing.T) {
	b := newBench(t, arithmetic)
	r, _ := b.run(ExitDone)
	complete := true
	for _, l := range r.Host.Confinement {
		complete = complete && l.Active
	}
	b = newBench(t, arithmetic)
	if complete {
		b.run(ExitDone, "--require-confinement")
		return
	}
	_, said := b.run(ExitWrong, "--require-confinement")
	if !strings.Contains(said, "--require-confinement: steps cannot be confined by") {
		t.Errorf("it said %q", said)
	}
}
