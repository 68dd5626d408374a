// Package plan turns a parsed recipe and its checked Go code into a plan:
// which value fills which parameter of which step ([Wire]), and the keys under
// which results are kept ([Key]).
//
// Wiring is by name alone. A parameter is filled by the input, setting or
// earlier result of its name; "priors" by the parameter table of the step's
// section; "seed" by a number derived from the step's key. A name has one
// source, and a step uses only what stands above it.
//
// A key names a computation by everything that can change its outcome, and by
// nothing else. Its text is made of labelled lines, so that two keys can be
// compared line by line to say what changed.
package plan
