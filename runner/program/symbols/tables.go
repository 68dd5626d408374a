// Package symbols holds the compiled functions and types of the packages that
// recipes can use, in the form that the interpreter takes: by import path and
// name. One file per package is generated from its exported declarations.
package symbols

// The directive stands in the file whose name comes last: files before it come
// and go while it runs.

//go:generate go run ../generate -C ..

import "reflect"

// Table maps "PATH/NAME" of a package to its symbols: functions as values,
// types as nil pointers to them, and under "_" and the name of an interface
// the wrapper that lends a recipe's methods to it.
var Table = map[string]map[string]reflect.Value{}
