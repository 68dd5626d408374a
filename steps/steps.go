// Package steps is the root of the native step library: everything that the
// Go code of a recipe can call.
//
// The sub-packages hold data types, file readers, physics, systematics,
// inference, spectra, figures and checks. They are pure functions of their
// arguments: no global state, and no input or output but in the readers.
// They know nothing of recipes, results stores or reports.
//
// This package itself only carries the library's own source text, embedded,
// so that the program can name exactly which code a result was computed with
// (see [Sources]).
package steps

import "embed"

// Sources holds the Go source files of every step package, tests included, as
// they were when the program was built. File names are relative to this
// folder, for example "transit/flux.go".
//
//go:embed */*.go
var Sources embed.FS
