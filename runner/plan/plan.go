package plan

import (
	"rimlight/runner/program"
	"rimlight/runner/recipe"
)

// A Plan is a recipe wired up: every parameter of every step has its source.
type Plan struct {
	Recipe   *recipe.Recipe
	Inputs   []Input
	Settings []Setting
	Steps    []Step // in the order of the recipe, which is an order of execution
}

// An Input is an input of the recipe with the files it is read from.
type Input struct {
	recipe.Input
	Type    string   // Go type of what is read
	Paths   []string // resolved; none for an optional input that is absent
	Given   bool     // by the command line instead of the recipe
	Columns []recipe.Column
}

// A Setting is a setting of the recipe with the value in force.
type Setting struct {
	recipe.Setting
	InForce recipe.Value
	Given   bool // by the command line instead of the recipe
}

// A Step is a step of the recipe with its arguments.
type Step struct {
	program.Step
	Section int // index into Recipe.Sections
	Fence   int // index among the fenced blocks of the recipe
	Args    []Arg
	Each    int // index in Args of the fan-out's element, -1 for a plain step
	Needs   []int
}

// ResultType is the Go type under which result i is known to later steps: the
// element's type for a plain step, a slice of it for a fan-out.
func (s *Step) ResultType(i int) string {
	if s.Each >= 0 {
		return "[]" + s.Results[i].Type
	}
	return s.Results[i].Type
}

// Source says what kind of thing fills a parameter.
type Source string

// Sources of arguments.
const (
	FromInput   Source = "input"
	FromSetting Source = "setting"
	FromResult  Source = "result"
	FromPriors  Source = "priors"
	FromElement Source = "element" // one element of an earlier result
	FromSeed    Source = "seed"
)

// An Arg is a parameter of a step and what fills it.
type Arg struct {
	Name   string
	Type   string
	Source Source
	Input  int // index into Plan.Inputs, for FromInput
	Step   int // index into Plan.Steps, for FromResult and FromElement
	Result int // index among that step's results
	Value  any // the value of a setting, or fit.Priors
	From   string
}
