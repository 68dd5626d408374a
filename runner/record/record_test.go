package record

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"rimlight/runner/plan"
	"rimlight/runner/store"
)

// TestDamage holds that a record whose keys are not those of its texts is not
// believed, and that one that is there is told from one that is not.
func TestDamage(t *testing.T) {
	text := plan.KeyText("rimlight key\nstep Clean\n")
	key := text.Key().String()
	r := &Record{Format: Format, Steps: []Step{
		{Name: "Clean", Computation: Computation{State: "computed", Key: key, KeyText: text, Results: []Result{{Name: "clean", Hash: store.HashOf([]byte("clean")).String()}}}},
		{Name: "Fit", Computation: Computation{State: "not reached", KeyText: text}},
	}}
	sound, err := r.Bytes()
	if err != nil {
		t.Fatal(err)
	}
	file := filepath.Join(t.TempDir(), "run.json")
	read := func(content string) error {
		if err := os.WriteFile(file, []byte(content), 0o644); err != nil {
			t.Fatal(err)
		}
		got, err := Read(file)
		if err == nil && len(got.Keys()) != 1 {
			t.Errorf("it has the keys %v", got.Keys())
		}
		return err
	}
	if err := read(string(sound)); err != nil {
		t.Errorf("a sound record: %v", err)
	}
	other := store.KeyOf("another").String()
	for name, content := range map[string]string{
		"another key":    strings.Replace(string(sound), key, other, 1),
		"no key":         strings.Replace(string(sound), key, key[:63]+"g", 1),
		"another text":   strings.Replace(string(sound), "step Clean", "step Clear", 1),
		"another format": strings.Replace(string(sound), Format, Format+"0", 1),
		"cut":            string(sound[:len(sound)/2]),
		"empty":          "",
		"a short hash":   strings.Replace(string(sound), store.HashOf([]byte("clean")).String(), "12", 1),
	} {
		if err := read(content); err == nil || errors.Is(err, fs.ErrNotExist) || !strings.Contains(err.Error(), file) {
			t.Errorf("%s: %v", name, err)
		}
	}
	os.Remove(file)
	if _, err := Read(file); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("no record: %v", err)
	}
}
