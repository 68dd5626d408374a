package plan

import (
	"encoding/binary"
	"fmt"
	"sort"
	"strconv"
	"strings"

	"rimlight/runner/store"
	"rimlight/steps/fit"
)

// A KeyText is the text of a key: labelled lines that together name
// everything that can change a result. Whatever new thing can influence a
// result belongs in here too.
type KeyText string

// Key is the hash of the text.
func (t KeyText) Key() store.Key { return store.KeyOf(string(t)) }

// Seed is the random seed of the computation: the first eight bytes of its
// key, never zero.
func (t KeyText) Seed() uint64 {
	k := t.Key()
	if s := binary.BigEndian.Uint64(k[:8]); s != 0 {
		return s
	}
	return 1
}

// keyVersion changes when the meaning of a key's lines does.
const keyVersion = "rimlight key 1"

// StepKey is the text of a step's key, or of one element's of a fan-out. The
// hashes are those of the content of inputs and results, in the order of
// s.Args; settings and priors are spelled out, so their hashes are ignored.
func StepKey(s *Step, hashes []string, lib *Library, build Build) KeyText {
	lines := []string{keyVersion, "step " + s.Name, "code " + s.CodeHash}
	for i, a := range s.Args {
		switch a.Source {
		case FromSeed:
			lines = append(lines, "seed "+a.Name)
		case FromSetting:
			lines = append(lines, fmt.Sprintf("setting %s %s %s", a.Name, a.Type, spell(a.Value)))
		case FromPriors:
			priors, _ := a.Value.(fit.Priors)
			for n, p := range priors {
				lines = append(lines, fmt.Sprintf("prior %s %d %s %s %s %s %s %q", p.Name, n, p.Kind, spell(p.A), spell(p.B), spell(p.Lo), spell(p.Hi), p.Unit))
			}
		default:
			lines = append(lines, fmt.Sprintf("%s %s %s %s", a.Source, a.Name, a.Type, hashes[i]))
		}
	}
	for _, p := range lib.Reached(s.Packages) {
		lines = append(lines, "library "+p+" "+lib.Hash(p))
	}
	lines = append(lines, build.lines()...)
	return KeyText(strings.Join(lines, "\n") + "\n")
}

// spell writes a setting's value so that equal values, and only they, are
// spelled alike.
func spell(v any) string {
	switch v := v.(type) {
	case float64:
		return strconv.FormatFloat(v, 'g', -1, 64)
	case []float64:
		texts := make([]string, len(v))
		for i, x := range v {
			texts[i] = spell(x)
		}
		return strings.Join(texts, ",")
	}
	return fmt.Sprintf("%#v", v)
}

// ReadKey is the text of the key under which a raw input, as read, is kept.
// The sums are the SHA-256 of its files.
func ReadKey(in *Input, sums []string, lib *Library, build Build) KeyText {
	lines := []string{keyVersion, "read " + in.Layout}
	for i, s := range sums {
		lines = append(lines, fmt.Sprintf("file %d %s", i, s))
	}
	for i, c := range in.Columns {
		lines = append(lines, fmt.Sprintf("column %d %q %q %q %q %x", i, c.Role, c.HDU, c.Name, c.Unit, c.Offset))
	}
	for _, p := range lib.Reached([]string{libraryPath + "lightcurve", libraryPath + "limbtable"}) {
		lines = append(lines, "library "+p+" "+lib.Hash(p))
	}
	lines = append(lines, build.lines()...)
	return KeyText(strings.Join(lines, "\n") + "\n")
}

// Why compares the text of a key with that of an earlier run of the same step
// and says, in words, what changed. An empty earlier text gives "first time",
// equal texts give "".
func (t KeyText) Why(before KeyText) string {
	if before == "" {
		return "first time"
	}
	old, now := before.labelled(), t.labelled()
	changed := map[string]bool{}
	for label, v := range now {
		if w, ok := old[label]; !ok || w != v {
			changed[label] = true
		}
	}
	for label := range old {
		if _, ok := now[label]; !ok {
			changed[label] = true
		}
	}
	if len(changed) == 0 {
		if t != before {
			return "order changed"
		}
		return ""
	}
	labels := make([]string, 0, len(changed))
	for l := range changed {
		labels = append(labels, l)
	}
	sort.Slice(labels, func(i, j int) bool {
		a, b := rank(labels[i]), rank(labels[j])
		if a != b {
			return a < b
		}
		return labels[i] < labels[j]
	})
	reasons := make([]string, 0, len(labels))
	for _, l := range labels {
		if r := reason(l); len(reasons) == 0 || reasons[len(reasons)-1] != r {
			reasons = append(reasons, r)
		}
	}
	return strings.Join(reasons, ", ")
}

// labelled gives the lines of a key's text by what they are about.
func (t KeyText) labelled() map[string]string {
	out := map[string]string{}
	for _, line := range t.lines() {
		out[labelOf(line)] = line
	}
	return out
}

// labelOf is what a line of a key's text is about: "setting clipSigma" for the
// line "setting clipSigma float64 5".
func labelOf(line string) string {
	kind, rest, _ := strings.Cut(line, " ")
	switch kind {
	case "setting", "input", "result", "element", "prior", "library", "module", "program", "file", "column":
		name, value, _ := strings.Cut(rest, " ")
		if kind == "program" && name == "setting" {
			setting, _, _ := strings.Cut(value, "=")
			name += " " + setting
		}
		return kind + " " + name
	}
	return kind
}

func rank(label string) int {
	for i, p := range []string{"rimlight", "code", "setting", "prior", "input", "file", "column", "result", "element", "library", "module", "program"} {
		if strings.HasPrefix(label, p) {
			return i
		}
	}
	return 99
}

func reason(label string) string {
	kind, name, _ := strings.Cut(label, " ")
	switch kind {
	case "code":
		return "code changed"
	case "setting", "input", "result":
		return kind + " " + name + " changed"
	case "element":
		return "element " + name + " changed"
	case "prior":
		return "prior of " + name + " changed"
	case "file":
		return "file changed"
	case "column":
		return "column table changed"
	case "read":
		return "layout changed"
	case "library":
		return "library changed: " + strings.TrimPrefix(name, "rimlight/")
	case "module":
		return "module changed: " + name
	case "program":
		return "program changed: " + name
	}
	return label + " changed"
}
