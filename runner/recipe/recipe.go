// Package recipe reads the Markdown of a recipe: its title, its tables of
// inputs, settings, priors and columns, and its Go steps, each with its place
// in the file. It knows Markdown and the meaning of tables; it does not read
// Go.
//
// A table has a meaning when its first header cell is one of
//
//	input      file, layout, about
//	setting    value, unit, about, and if need be also try
//	parameter  prior, unit, about
//	column     name, and if need be input, hdu, unit, offset, about
//
// The further columns stand in any order, and each row has a cell for each.
// All other tables are prose. In a cell, backticks or emphasis around the whole
// and backslashes before punctuation do not count; a pipe is written \|.
package recipe

import (
	"rimlight/runner/diag"
	"rimlight/steps/fit"
)

// A Recipe is a parsed Markdown file.
type Recipe struct {
	File     string // as named by the user, used in every position
	Source   []byte // the file's bytes, without a byte order mark
	Title    string // text of the first level-1 heading
	Sections []Section
	Inputs   []Input
	Settings []Setting
	Columns  []Column
	Blocks   []Block // Go fences in file order

	code []span // the lines of Blocks
}

// A Section is a heading with what stands under it, up to the next heading.
// Everything before the first heading is section 0, without a heading.
type Section struct {
	Pos     diag.Pos
	Level   int // 1 to 6; 0 for section 0
	Heading string
	Priors  []Prior // parameter table of this section, nil when it has none
}

// An Input is a row of an input table: a named raw file.
type Input struct {
	Pos    diag.Pos // of the name's cell
	Name   string
	Files  []string // as written, split at ";"; relative to the recipe's folder; empty for an optional input that is absent
	Layout string   // how to read it: one of Layouts
	About  string

	FilePos   diag.Pos
	LayoutPos diag.Pos
}

// A Setting is a row of a setting table: a named value that a reader of the
// recipe may want to change.
type Setting struct {
	Pos      diag.Pos // of the name's cell
	Name     string
	Value    Value
	Unit     string  // FITS-standard unit string, empty for a pure number or text
	AlsoTry  []Value // alternatives
	About    string
	ValuePos diag.Pos
}

// A Value is a setting's value as written: a number, a text, a boolean, a list
// or a grid; see [Kind] for the notation. What it can serve as depends on the
// step parameter that it fills; see [Value.As].
type Value struct {
	Text string // trimmed cell text
}

// A Prior is a row of a parameter table. Terms may name settings, so that the
// numbers are known only when settings are.
type Prior struct {
	Pos      diag.Pos
	Name     string
	Kind     string // as in package fit
	Terms    []Term // the numbers in the parentheses, or the one after "="
	Unit     string
	About    string
	PriorPos diag.Pos
}

// A Term is a number, or the value of a setting plus an offset: "0.05",
// "period", "midTransit - 0.02".
type Term struct {
	Setting string // empty for a plain number
	Offset  float64
	Pos     diag.Pos
}

// A Column is a row of a column table: where a quantity of the light-curve
// table stands in a file of another layout.
type Column struct {
	Pos    diag.Pos
	Role   string  // TIME, FLUX, FLUX_ERR, WAVE_LO, WAVE_HI, or the name of an auxiliary
	Input  string  // the input it belongs to; empty means every light-curve table
	HDU    string  // HDU name or number, empty for the default
	Name   string  // column name in the file
	Unit   string  // unit in the file, overriding the file's own; empty keeps it
	Offset float64 // added to the column's values, in Unit (times stored as BJD - 2450000 have 2450000)
	About  string
}

// A Block is one fenced Go block.
type Block struct {
	Fence   int    // index among all fenced blocks of the file, from 0
	Section int    // index of the section it stands in
	Line    int    // line of the first code line, from 1
	Code    string // the lines between the fences, as written
}

// Resolve gives the numbers of a section's priors, with settings filled in.
// The settings' values are looked up by name in value.
func Resolve(priors []Prior, value func(setting string) (float64, bool)) (fit.Priors, diag.List) {
	return resolve(priors, value)
}
