// Package record is the machine-readable record of a run, run.json: what was
// run on what, what came out, under which keys and hashes. It is what a later
// run compares itself with, and what a report is accountable to.
package record

import (
	"encoding/json"
	"fmt"
	"os"
	"time"

	"rimlight/runner/plan"
	"rimlight/runner/store"
)

// Format marks the files that this package writes. A file with another mark
// is not guessed at.
const Format = "rimlight run 1"

// A Record is the content of run.json.
type Record struct {
	Format   string    `json:"format"`
	Title    string    `json:"title"`
	Recipe   File      `json:"recipe"`
	Outcome  string    `json:"outcome"`
	Started  time.Time `json:"started"`
	Ended    time.Time `json:"ended"`
	Command  []string  `json:"command"`
	Program  Program   `json:"program"`
	Host     Host      `json:"host"`
	Limits   Limits    `json:"limits"`
	Inputs   []Input   `json:"inputs"`
	Settings []Setting `json:"settings"`
	Steps    []Step    `json:"steps"`
	Checks   []Check   `json:"checks"`
	Outputs  []File    `json:"outputs"`
	Library  []Package `json:"library"`
	Notes    []string  `json:"notes,omitempty"`
}

// A File is a file with its identity. Size is in bytes, SHA256 in hex.
type File struct {
	Name   string `json:"name"`
	Size   int64  `json:"size"`
	SHA256 string `json:"sha256"`
}

// A Program says what computed the results.
type Program struct {
	Version  string   `json:"version"`
	Revision string   `json:"revision,omitempty"`
	SHA256   string   `json:"sha256,omitempty"` // of the executable
	Go       string   `json:"go"`
	Settings []string `json:"settings,omitempty"`
	Modules  []Module `json:"modules"`
}

// A Module is a dependency of the program.
type Module struct {
	Path    string `json:"path"`
	Version string `json:"version"`
	Sum     string `json:"sum,omitempty"`
}

// A Host is the machine of the run.
type Host struct {
	Name string `json:"name"`
	OS   string `json:"os"`
	Arch string `json:"arch"`
	CPUs int    `json:"cpus"`

	Confinement []Layer `json:"confinement,omitempty"`
}

// A Layer is a means by which steps were confined, or why it was not there.
type Layer struct {
	Name   string `json:"name"`
	Active bool   `json:"active"`
	Detail string `json:"detail"`
}

// Limits are what one step was allowed to use up.
type Limits struct {
	StepSeconds float64 `json:"step_seconds"`
	StepMemory  int64   `json:"step_memory"` // bytes, 0 for as much as the arguments asked for
}

// A Package is a step-library package with the hash of its sources.
type Package struct {
	Path string `json:"path"`
	Hash string `json:"hash"`
}

// An Input is a raw input as it was used.
type Input struct {
	Name   string `json:"name"`
	Layout string `json:"layout"`
	Files  []File `json:"files"`
	Computation
}

// A Setting is a setting as it was used.
type Setting struct {
	Name    string `json:"name"`
	Value   string `json:"value"`
	Unit    string `json:"unit,omitempty"`
	Changed bool   `json:"changed,omitempty"` // given on the command line
}

// A Step is a step with its results.
type Step struct {
	Name string `json:"name"`
	Computation
	Elements []Computation `json:"elements,omitempty"`
}

// A Computation is one thing looked up or computed.
type Computation struct {
	State   string       `json:"state"`
	Why     string       `json:"why,omitempty"`
	Error   string       `json:"error,omitempty"`
	Key     string       `json:"key,omitempty"`
	KeyText plan.KeyText `json:"key_text,omitempty"`
	Seed    uint64       `json:"seed,omitempty"`
	Results []Result     `json:"results,omitempty"`
	Seconds float64      `json:"seconds,omitempty"` // computing time, whenever it was computed
	When    *time.Time   `json:"when,omitempty"`
	Host    string       `json:"host,omitempty"`
}

// A Result is a named result in the store.
type Result struct {
	Name string `json:"name"`
	Type string `json:"type"`
	Hash string `json:"hash"`
	Size int64  `json:"size"`
}

// A Check is a verdict.
type Check struct {
	Step   string   `json:"step"`
	Name   string   `json:"name"`
	Value  *float64 `json:"value"` // null when it could not be computed
	Unit   string   `json:"unit,omitempty"`
	Limit  string   `json:"limit"`
	Passed bool     `json:"passed"`
}

// Read reads a record. A file that does not exist gives an error that
// satisfies os.IsNotExist.
func Read(path string) (*Record, error) {
	b, err := os.ReadFile(path)
	if err != nil {
		return nil, err
	}
	r := new(Record)
	if err := json.Unmarshal(b, r); err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	if r.Format != Format {
		return nil, fmt.Errorf("%s: the format is %q, expected %q", path, r.Format, Format)
	}
	if err := r.sound(); err != nil {
		return nil, fmt.Errorf("%s is damaged: %w", path, err)
	}
	return r, nil
}

// sound demands that each key is that of its text and that each hash is one:
// what a report needs must not be told from a file that is damaged.
func (r *Record) sound() error {
	var err error
	r.each(func(c Computation) {
		if _, e := store.ParseKey(c.Key); c.Key != "" && e != nil {
			err = e
		} else if c.Key != "" && c.KeyText != "" && c.KeyText.Key().String() != c.Key {
			err = fmt.Errorf("the key %.12s is not that of its text", c.Key)
		}
		for _, v := range c.Results {
			if _, e := store.ParseHash(v.Hash); e != nil {
				err = e
			}
		}
	})
	return err
}

// Bytes is the content of run.json.
func (r *Record) Bytes() ([]byte, error) {
	b, err := json.MarshalIndent(r, "", " ")
	return append(b, '\n'), err
}

// Keys are the keys of everything that the recorded run computed or used.
func (r *Record) Keys() []store.Key {
	var out []store.Key
	r.each(func(c Computation) {
		if k, err := store.ParseKey(c.Key); err == nil {
			out = append(out, k)
		}
	})
	return out
}

// Hashes are the hashes of all results of the recorded run, also of those that
// were put together from others and have no key of their own.
func (r *Record) Hashes() []store.Hash {
	var out []store.Hash
	r.each(func(c Computation) {
		for _, res := range c.Results {
			if h, err := store.ParseHash(res.Hash); err == nil {
				out = append(out, h)
			}
		}
	})
	return out
}

// each goes through all computations.
func (r *Record) each(do func(c Computation)) {
	for _, in := range r.Inputs {
		do(in.Computation)
	}
	for _, s := range r.Steps {
		do(s.Computation)
		for _, e := range s.Elements {
			do(e)
		}
	}
}

// KeyText is the text of the key that a step, an input (element -1) or an
// element of a fan-out had in the recorded run, "" when there was none or it
// never gave a result.
func (r *Record) KeyText(name string, element int) plan.KeyText {
	if r == nil {
		return ""
	}
	for i := range r.Steps {
		s := &r.Steps[i]
		if s.Name != name {
			continue
		}
		if element < 0 {
			return s.KeyText
		}
		if element < len(s.Elements) {
			return s.Elements[element].KeyText
		}
		return ""
	}
	for _, in := range r.Inputs {
		if in.Name == name && element < 0 {
			return in.KeyText
		}
	}
	return ""
}
