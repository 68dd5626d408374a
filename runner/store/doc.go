// Package store keeps results that took long to compute. It knows bytes and
// their names, nothing of recipes.
//
// An object is a string of bytes, named by the SHA-256 of its content, its
// [Hash]. A record says which objects a computation gave; it is named by a
// [Key], the SHA-256 of a text that names everything that can change the
// outcome. Objects come first, records last, so that a record never names what
// was not there. In the folder of a store:
//
//	rimlight-store       says that this is a store, and of which format
//	README.txt           for whoever finds the folder
//	objects/ab/abcd…     objects, read-only; sha256sum of a file prints its name
//	records/ab/abcd…     records: JSON, with a checksum
//	records/ab/abcd….x   records of the same computation with other results
//	damaged/             what was found damaged and set aside, never used again
//	tmp/                 files being written
//
// Nothing is ever changed in place. A file is written under a temporary name,
// its length checked, synced to disk, given its name, and the folder synced.
// Whoever is stopped on the way leaves a file in tmp/ and nothing else.
//
// Objects and records are checked on every read. What is damaged is moved to
// damaged/ and reported: a result is then to be computed again, never guessed.
//
// Several processes, on several machines, may use a store at once, without
// locks. Two that put an object write the same bytes. Of two that set a record,
// the first wins, and the other compares its own with it. On a file system
// without hard links that last guarantee is weaker: if both set a record within
// the same moment, the second replaces the first unseen. Nobody else may write
// into the folder, and nothing is deleted from it.
package store
