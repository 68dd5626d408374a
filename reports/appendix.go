package reports

import (
	"fmt"
	"html/template"
	"strconv"
	"strings"
)

// An appendixView is the provenance of everything in the report.
type appendixView struct {
	Inputs   []inputView
	Settings []settingView
	Steps    []provenanceView
	Host     []fact
	Modules  []Module
	Library  []Package
	Command  string
	Recipe   *fileView
	Source   []template.HTML // the recipe, line by line
}

type inputView struct {
	ID, Name, Layout, State, Hash string
	Files                         []fileLine
}

type fileLine struct{ Name, Size, SHA256 string }

type settingView struct {
	Name, Value, Unit, Recipe string
	Changed                   bool
}

type provenanceView struct {
	Name, ID, Class, Key, Seed, When, Took string
	State                                  State
	Results                                []resultView
}

func (b *builder) appendix() appendixView {
	d := b.doc
	v := appendixView{Command: listing(d.Command), Host: hostFacts(d)}
	for _, in := range d.Inputs {
		view := inputView{ID: "input-used-" + slug(in.Name), Name: label(in.Name), Layout: label(in.Layout), State: label(string(in.State)), Hash: label(in.Hash)}
		for _, f := range in.Files {
			view.Files = append(view.Files, fileLine{label(f.Name), strconv.FormatInt(f.Size, 10), label(f.SHA256)})
		}
		v.Inputs = append(v.Inputs, view)
	}
	for _, s := range d.Settings {
		v.Settings = append(v.Settings, settingView{label(s.Name), sentence(s.Value), label(s.Unit), sentence(s.Recipe), s.Changed})
	}
	for _, s := range d.Steps {
		view := provenanceView{Name: label(s.Name), ID: stepID(s.Name), Class: class(s.State), State: s.State, Key: label(s.Key), When: utc(s.When), Took: duration(s.Took)}
		if s.Seed != 0 {
			view.Seed = strconv.FormatUint(s.Seed, 10)
		}
		for _, r := range s.Results {
			view.Results = append(view.Results, resultView{Name: label(r.Name), Type: shortType(r.Type), Hash: label(r.Hash), Size: strconv.FormatInt(r.Size, 10)})
		}
		v.Steps = append(v.Steps, view)
	}
	for _, m := range d.Modules {
		v.Modules = append(v.Modules, Module{label(m.Path), label(m.Version), label(m.Sum)})
	}
	for _, p := range d.Library {
		v.Library = append(v.Library, Package{label(p.Path), label(p.Hash)})
	}
	if len(d.Source) > 0 {
		v.Recipe = newFile(recipeName(d), "text/markdown", d.Source)
		v.Source = numberedLines(string(d.Source))
	}
	return v
}

// recipeName is the name under which the recipe can be saved.
func recipeName(d Document) string {
	n := slug(strings.TrimSuffix(d.File, ".md"))
	if n == "" {
		n = "recipe"
	}
	return n + ".md"
}

func hostFacts(d Document) []fact {
	h := d.Host
	machine := ""
	if h.OS != "" {
		machine = fmt.Sprintf("%s, %s, %s", label(h.OS), label(h.Arch), count(h.CPUs, "processor"))
	}
	return facts(
		"started", utc(d.Started),
		"ended", utc(d.Ended),
		"rimlight", label(h.Version),
		"revision", label(h.Revision),
		"program, SHA-256", label(h.Executable),
		"Go", label(h.GoVersion),
		"build settings", sentence(strings.Join(h.Settings, ", ")),
		"machine", machine,
		"confinement of steps", sentence(strings.Join(h.Confinement, ", ")),
	)
}

// numberedLines escapes text line by line, with the number of each line.
func numberedLines(s string) []template.HTML {
	w := codeWriter{line: 1}
	w.open()
	w.write("", strings.TrimSuffix(s, "\n"))
	w.close()
	return w.lines
}
