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
//	runs/                the run.json of each run whose report needs results
//	using/               who uses the store at this moment
//	tmp/                 files being written
//
// Nothing is ever changed in place, but for signs of life in using/. A file is
// written under a temporary name, its length checked, synced to disk, given its
// name, and the folder synced. Whoever is stopped on the way leaves a file in
// tmp/ and nothing else; a run deletes those that are older than a day.
//
// Objects and records are checked on every read. What is damaged is moved to
// damaged/ and reported: a result is then to be computed again, never guessed.
// The mark of the format and the text for people vouch for each other.
//
// # Sharing
//
// Several processes, on several machines, may use a store at once, without
// locks. Two that put an object write the same bytes. Of two that set a record,
// the first wins, and the other compares its own with it. On a file system
// without hard links that last guarantee is weaker: if both set a record within
// the same moment, the second replaces the first unseen. Nobody else may write
// into the folder. Only trimming deletes results, and it does so only while
// nobody else uses the store.
//
// This is what it relies on, and what local file systems and NFS from version 3
// promise:
//
//   - O_EXCL gives a name in tmp/ to one process only;
//   - rename replaces a name in one go, and link fails where the name is taken.
//     A network file system may carry out either, lose the answer and repeat
//     the question; that is recognised by the file that has the name;
//   - who opens a file after another has closed it sees all of it. Files are
//     complete before they get their name, and are never opened for writing
//     afterwards, so that no other order matters;
//   - a folder's list is fresh for the process that has just put a file there,
//     which is how a run and a trimming see each other;
//   - a disk's clock does not stand still. It may be wrong, and so may the clocks
//     of the machines: ages are differences between times of files, and only
//     decide on what to delete.
//
// File locks are not used: on network file systems they may be missing, or mean
// nothing to other machines. Whether a process is alive is never asked for the
// same reason; who has given no sign of life for long counts as gone.
package store
