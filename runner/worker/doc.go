// Package worker runs untrusted or heavy parts of a run in processes of their
// own.
//
// A worker is the same program, started again with an empty environment in an
// empty working directory. It speaks with its parent over its standard input
// and output, in [Message] frames: the parent asks, the worker answers, one
// answer for each question. What a worker says is data; nothing in it is ever
// obeyed. A worker that dies takes nothing with it but the answer that it
// owed.
//
// The first thing that a worker is told is the limits that it has to live
// under. It confines itself to them (package confine) before it looks at
// anything that comes from a recipe or a raw file, and reports how far the
// kernel was able to.
//
// There are four questions: check the Go code of a recipe, load it, call one
// of its steps, and read a raw input file. A file to be read is opened by the
// parent and handed over as an open descriptor, so a worker needs no path.
package worker
