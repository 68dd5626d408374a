// Package program makes the Go code of a recipe ready to run, and runs it.
//
// The source of a program is the recipe with everything but its Go blocks
// blanked, so that lines and columns are those of the Markdown. [Check] parses
// it, type-checks it against the export data of the available packages, holds
// every exported function (a step) to the rules for steps, and refuses
// what the interpreter gets wrong or what could give a different result
// another time. The outcome is a [Program]: its steps, each with its
// parameters, its results, and the normal form of its code.
//
// The normal form of a step is text: the step and every function, type, method
// and constant of the recipe that it reaches, in a fixed order, without
// comments, parentheses and layout. Two steps with equal normal forms compute
// the same, so its hash goes into the step's key.
//
// [Program.Compile] hands the checked syntax tree to the interpreter, not the
// text: what was checked is what runs. Before that the tree is rewritten to the
// part of Go that the interpreter gets right: constant expressions become
// literals of their final type, named results become local variables,
// multiple assignments are split where needed, and so on (see normalise.go). A
// compiled recipe is a [Machine].
//
// Signs of zeros are kept where values are handed on (see signs.go). Where Go
// leaves the order of evaluation open, so that compilers may differ, the code is
// refused (see order.go), as are characters and names that deceive a reader (see
// letters.go).
//
// Checking can use much memory and time on hostile code (constants that grow),
// so it belongs into a confined process, as running does.
package program
