package plan

import (
	"fmt"
	"runtime"
	"runtime/debug"
	"sort"
	"strings"

	"golang.org/x/sys/cpu"

	"rimlight/runner/canon"
	"rimlight/runner/program"
)

// A Build says what the running program was made from, as far as it can change
// a result.
type Build struct {
	Go       string // version of the Go toolchain
	Arch     string
	Settings []string // compiler settings that can change numbers, "GOAMD64=v1"
	Modules  []Module // dependencies that compute or interpret, sorted
	Version  string   // of rimlight itself, for the record; not part of keys
	Revision string   // of the source tree, for the record; not part of keys
}

// A Module is a dependency with its checksum.
type Module struct{ Path, Version, Sum string }

// numeric are the dependencies that take part in computing or drawing a
// result.
var numeric = map[string]bool{
	"github.com/traefik/yaegi": true,
	"gonum.org/v1/gonum":       true,
	"gonum.org/v1/plot":        true,
}

// ReadBuild looks at the build information in the running program.
func ReadBuild() Build {
	b := Build{Go: runtime.Version(), Arch: runtime.GOARCH, Version: "(devel)"}
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return b
	}
	if info.Main.Version != "" {
		b.Version = info.Main.Version
	}
	for _, s := range info.Settings {
		switch {
		case s.Key == "vcs.revision":
			b.Revision = s.Value
		case s.Key == "vcs.modified" && s.Value == "true":
			b.Revision += " (modified)"
		case strings.HasPrefix(s.Key, "GO"+strings.ToUpper(runtime.GOARCH)), s.Key == "GOEXPERIMENT", s.Key == "GOFIPS140", s.Key == "-tags":
			b.Settings = append(b.Settings, s.Key+"="+s.Value)
		}
	}
	sort.Strings(b.Settings)
	for _, m := range info.Deps {
		if m.Replace != nil {
			m = &debug.Module{Path: m.Path, Version: m.Replace.Path + "@" + m.Replace.Version, Sum: m.Replace.Sum}
		}
		if numeric[m.Path] {
			b.Modules = append(b.Modules, Module{m.Path, m.Version, m.Sum})
		}
	}
	sort.Slice(b.Modules, func(i, j int) bool { return b.Modules[i].Path < b.Modules[j].Path })
	return b
}

// lines are the part of a key's text that the build contributes.
func (b Build) lines() []string {
	out := []string{
		"program go " + b.Go,
		"program arch " + b.Arch,
		"program rules " + program.Version,
		"program encoding " + canon.Version,
	}
	for _, s := range b.Settings {
		out = append(out, "program setting "+s)
	}
	for _, m := range b.Modules {
		out = append(out, "module "+m.Path+" "+m.Version+" "+m.Sum)
	}
	return out
}

// Fingerprint lists all of the program, and of the processor it runs on, that
// could make another machine compute other numbers. Where two are equal, equal
// keys have equal results.
func Fingerprint(lib *Library, build Build) KeyText {
	lines := []string{keyVersion}
	for _, p := range lib.Reached(lib.packages()) {
		lines = append(lines, "library "+p+" "+lib.Hash(p))
	}
	lines = append(lines, build.lines()...)
	// Package math rounds its exponential otherwise where there is none.
	lines = append(lines, fmt.Sprintf("program fused-multiply-add %v", cpu.X86.HasAVX && cpu.X86.HasFMA))
	return KeyText(strings.Join(lines, "\n") + "\n")
}
