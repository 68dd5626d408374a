// Package surface holds the step library against hostile callers. Its tests
// call everything that a recipe can call, functions and methods, with random
// arguments: valid ones with a few fields spoiled, and ones made from nothing.
//
// A call fails the test when it panics, takes more than two seconds of
// processor time or more than 256 MiB of memory, writes to its arguments,
// returns a value that cannot be kept as a result (see package canon) or other
// values for the same arguments, or an error that no one could read. Calls are
// made in a worker process, this test binary started again, whose memory is
// limited; the test outlives it and goes on behind the call that ended it.
//
// A call is known by its target and a number, from which its arguments follow:
// "lightcurve.White 417". Those that failed are kept in testdata/cases.txt and
// made first. What a number stands for changes with the generator and with the
// types of the arguments, so what was found there has a test in the package
// concerned, too.
//
// What recipes call of the standard library is not tried here. Little input can
// make much there (strings.Repeat, a width or precision in fmt and strconv, a
// sort with an inconsistent order), and it is the limits on memory and time of the
// process that runs the recipe which stop it.
//
// RIMLIGHT_SURFACE_CALLS sets how many calls are made (20000 unless set; a
// million for the night), RIMLIGHT_SURFACE_SEED where their numbers start, and
// RIMLIGHT_SURFACE_TARGET restricts them to targets whose name contains it.
package surface
