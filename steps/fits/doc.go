// Package fits reads and writes files of the Flexible Image Transport System
// (FITS), as defined by the FITS Standard 4.0 (FITS Working Group 2018): headers,
// images, binary tables and ASCII tables.
//
// A [File] is a sequence of [HDU]s (header and data units), numbered from 0.
// Each has a [Header], which is a list of [Card]s (keyword, value, comment),
// and data: an [Image], a [Table], or bytes of another kind that are skipped.
// A table is read column by column: [Table.Float64s] and its siblings for a
// known type, [Table.Values] for any. [Values] are one column's or one
// image's elements of one kind, with the scaling of the header (TSCALn,
// TZEROn, BSCALE, BZERO) applied and undefined ones marked. A [Writer] puts
// together a new file.
//
// # What a file may cost
//
// Nothing is allocated because a header says so: every size is computed
// without overflow and compared with the bytes that the file really has.
// Opening takes memory of a few times the file's headers, and reading a column
// a few tens of times the column's bytes. A gzip-compressed file may expand to
// 16 MiB plus 64 times its size, and the arrays of a variable-length column,
// which may legally share bytes, to 16 MiB plus 64 times the file's size.
//
// # Errors and warnings
//
// A file whose structure contradicts itself is refused with one error that
// names the HDU. What is wrong but cannot change any value is noted in
// [File.Warnings]: padding missing at the end, bytes after the last HDU,
// letters in a comment that are not ASCII, and so on. Checksums are compared
// only by [File.VerifyChecksums].
package fits
