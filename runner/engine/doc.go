// Package engine carries out a plan: it looks up what is known, computes what
// is not in worker processes, and keeps every result in the store as soon as
// it is there.
//
// A run can be stopped at any moment; what was finished is found again by its
// key. The order in which things happen to finish never shows in a result.
package engine
