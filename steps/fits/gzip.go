package fits

import (
	"bytes"
	"compress/gzip"
	"fmt"
	"io"
)

// A gzip-compressed file, and the arrays of a variable-length column, may take
// up to headroom + expansion x the file's size. Deflate can reach 1000:1 on
// empty data, light curves rarely exceed 10:1; the head room is for small files.
const (
	headroom  = 16 << 20
	expansion = 64
)

// allowance is how many bytes may come from a file of size bytes.
func allowance(size int64) int64 {
	if size > (1<<62)/expansion {
		return 1 << 62
	}
	return headroom + expansion*size
}

// isGzip reports whether a file starts as a gzip member does (RFC 1952).
func isGzip(r io.ReaderAt, size int64) bool {
	var magic [3]byte
	if size < int64(len(magic)) {
		return false
	}
	n, _ := r.ReadAt(magic[:], 0)
	return n == len(magic) && magic == [3]byte{0x1f, 0x8b, 8}
}

// gunzip decompresses a file into memory. It runs twice, first to learn the
// size, so that no more than that is ever allocated.
func gunzip(r io.ReaderAt, size int64) (*bytes.Reader, int64, error) {
	limit := allowance(size)
	expand := func(w io.Writer) (int64, error) {
		z, err := gzip.NewReader(io.NewSectionReader(r, 0, size))
		if err != nil {
			return 0, err
		}
		return io.Copy(w, io.LimitReader(z, limit+1))
	}
	n, err := expand(io.Discard)
	if err != nil {
		return nil, 0, fmt.Errorf("fits: the gzip-compressed file is damaged or cut short: %w", err)
	}
	if n > limit {
		return nil, 0, fmt.Errorf("fits: the gzip-compressed file of %d bytes expands to more than %d bytes: decompress it first if that is right", size, limit)
	}
	data := bytes.NewBuffer(make([]byte, 0, n+bytes.MinRead))
	if _, err := expand(data); err != nil {
		return nil, 0, fmt.Errorf("fits: reading the gzip-compressed file: %w", err)
	}
	return bytes.NewReader(data.Bytes()), n, nil
}
