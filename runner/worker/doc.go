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
//
// # Mass data
//
// A cube is as large as the memory of a machine allows, so there is to be one
// of it. Arguments and results cross in parts of a quarter of a MiB ([Arg],
// [Receiver]). The parent reads an argument from the store as it sends it, and
// knows from its hash at the end whether what it sent was good; if not, the
// worker is ended before it can answer. The worker decodes what comes in as it
// comes. It encodes results as it sends them, object by object, and the parent
// hashes them and puts large ones on disk as they arrive. So the parent holds
// no value, and the worker each value once. Small arguments that are the same
// at every call, as those of a fan-out are, stay in the worker in their encoded
// form; each call decodes them afresh.
//
// Handing over descriptors of objects, and of files for results, would spare
// the pipe, which costs a copy in memory. It would also need descriptors to be
// passed to a process that is confined already, files that can be written to
// in one that so far cannot, and care about who may still write to what has
// been hashed. With pipes the confinement stays what it is: a worker has
// three, and nothing else.
//
// A worker collects its garbage more eagerly than Go does by default once its
// heap is large (see TuneCollector): numbers need not be looked at, so it costs
// little, and the heap does not double.
package worker
