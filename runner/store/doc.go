// Package store keeps results that took long to compute. It knows bytes and
// their names, nothing of recipes.
//
// An object is a string of bytes, named by the SHA-256 of its content, its
// [Hash]. A record says which objects a computation gave; it is named by a
// [Key], the SHA-256 of a text that names everything that can change the
// outcome. Objects come first, records last, so a record never points at what
// was not yet there.
//
// In the folder of a store:
//
//	rimlight-store       a version mark; a folder with another version is refused
//	README.txt           for whoever finds the folder
//	objects/ab/abcd…     objects, read-only, by the first byte of their hash
//	records/ab/abcd…     records, JSON with a checksum of its own
//	damaged/             what was found to be damaged, set aside, never used
//	tmp/                 files being written
//
// Nothing is ever changed in place. A file is written under a temporary name,
// synced, renamed, and its folder synced; whoever is stopped on the way leaves
// a file in tmp/ and nothing else. Several processes may share a store, also
// over a network file system: they need no lock, since two writers of one name
// write the same bytes, or, for records, the second one checks what the first
// one wrote. Every read hashes what it read.
package store

// Version is the format of the folder. An unknown one is refused, not guessed.
const Version = "1"
