// Package canon turns Go values into canonical bytes and back: equal values
// have equal bytes, so that the hash of the bytes is the identity of the value.
//
// The bytes are CBOR in the core deterministic encoding of RFC 8949, section
// 4.2.1, with the typed arrays of RFC 8746 for slices and arrays of numbers:
//
//	bool               simple value false or true
//	integers           integer, shortest form
//	floats             half, single or double: the shortest that keeps the value
//	string             text; must be valid UTF-8
//	slice of numbers   typed array, little endian: tags 69-71 (uint16, uint32,
//	                   uint64, uint), 72, 77-79 (int8 to int64, int), 85 and 86
//	                   (float32, float64)
//	slice of uint8     typed array too, tag 64, so that flags are told from text
//	other slices       array
//	struct             map from the names of the fields, keys sorted bytewise
//	map                map from text or integers, keys sorted bytewise
//
// Fixed arrays are encoded as slices of their length are. A number that is not
// a number is the one NaN 0x7e00 (in typed arrays 0x7ff8000000000000): its
// payload is lost. The sign of zero is kept. A nil slice and an empty one have
// the same bytes and decode to nil; a nil map decodes to an empty map, which
// can be written to. What a value had in memory beyond that, such as the
// capacity of a slice or two slices sharing their elements, is not kept.
//
// Structs must have exported fields only. Pointers, interfaces, functions,
// channels, complex numbers and recursive types are refused, as are slices and
// arrays of values without content.
//
// Decoding is strict: whatever [Unmarshal], [Split] and [Tree] accept is what
// [Marshal] would write. They copy out of their input, never keep a part of
// it (but for Split, which says so), and need memory of no more than a small
// multiple of the input.
//
// The layout of a type, see [Layout], is its structure in words. Bytes travel
// with it in an envelope, see [Seal], so that bytes of a type whose fields have
// changed since are refused, not misread.
package canon

// Version names the encoding. It is part of the key of every result: it must
// change when the bytes of any value do.
const Version = "1"

// int and uint are encoded as 64 bits, which this refuses to compile without.
const _ uint = 1 << 63

// maxDepth bounds how deeply values nest.
const maxDepth = 64
