package fits

import (
	"bytes"
	"fmt"
	"io"
	"math/bits"
	"strconv"
	"strings"

	"rimlight/steps/nearest"
)

// blockSize is the unit of FITS files in bytes: headers and data fill whole
// blocks.
const blockSize = 2880

// maxWarnings is how many warnings are kept word for word.
const maxWarnings = 50

// A File is an open FITS file.
type File struct {
	HDUs     []*HDU
	Warnings []string // what was wrong without harm, in file order

	r       io.ReaderAt
	size    int64
	dropped int // warnings beyond maxWarnings
}

// Read opens a FITS file held in memory; data must not change while the file
// is in use.
func Read(data []byte) (*File, error) {
	return Open(bytes.NewReader(data), int64(len(data)))
}

// Open reads all headers of a FITS file of size bytes and checks them against
// each other and against the size; r stays in use for reading data. A file
// compressed by gzip is decompressed into memory.
//
// Errors name the HDU: not a FITS file, a header without END, mandatory
// keywords missing or impossible, data cut short (with the number of missing
// bytes).
func Open(r io.ReaderAt, size int64) (*File, error) {
	if isGzip(r, size) {
		data, n, err := gunzip(r, size)
		if err != nil {
			return nil, err
		}
		r, size = data, n
	}
	f := &File{r: r, size: size}
	offset := int64(0)
	for offset < size || len(f.HDUs) == 0 {
		more, err := f.startsHDU(offset)
		if err != nil {
			return nil, err
		}
		if !more {
			f.warn("%d bytes after the last HDU are not an HDU and are ignored", size-offset)
			break
		}
		hdu, err := f.readHDU(offset)
		if err != nil {
			return nil, fmt.Errorf("fits: %s: %w", hdu.Label(), err)
		}
		f.HDUs = append(f.HDUs, hdu)
		offset = hdu.dataOffset + padded(hdu.dataSize)
	}
	if f.dropped > 0 {
		f.Warnings = append(f.Warnings, fmt.Sprintf("%d more warnings", f.dropped))
	}
	return f, nil
}

// warn notes a warning.
func (f *File) warn(format string, args ...any) {
	if len(f.Warnings) == maxWarnings {
		f.dropped++
		return
	}
	f.Warnings = append(f.Warnings, fmt.Sprintf(format, args...))
}

// padded rounds a size up to whole blocks. Sizes beyond the largest that can
// be rounded stay as they are: no file reaches them.
func padded(n int64) int64 {
	if rest := n % blockSize; rest != 0 && n < 1<<62 {
		n += blockSize - rest
	}
	return n
}

// startsHDU reports whether an HDU starts at offset. The first must.
func (f *File) startsHDU(offset int64) (bool, error) {
	var start [9]byte
	n, err := f.r.ReadAt(start[:min(int64(len(start)), f.size-offset)], offset)
	if err != nil && err != io.EOF {
		return false, fmt.Errorf("fits: reading byte %d: %w", offset, err)
	}
	got := string(start[:n])
	if offset > 0 {
		return got == "XTENSION=", nil
	}
	if f.size == 0 {
		return false, fmt.Errorf("fits: the file is empty (0 bytes)")
	}
	if got != "SIMPLE  =" {
		return false, fmt.Errorf("fits: not a FITS file: it starts with %q instead of \"SIMPLE  =\"", got)
	}
	return true, nil
}

// readHDU reads the header at offset and checks it. On an error the HDU
// returned still carries what is known for the message.
func (f *File) readHDU(offset int64) (*HDU, error) {
	hdu := &HDU{Index: len(f.HDUs), Version: 1, file: f, offset: offset}
	warn := func(format string, args ...any) {
		f.warn("%s: "+format, append([]any{hdu.Label()}, args...)...)
	}
	text, err := f.headerText(offset)
	if err != nil {
		return hdu, err
	}
	if err := f.checkHeaderPadding(offset+int64(len(text)), warn); err != nil {
		return hdu, err
	}
	end := len(text)
	if hdu.Header, err = parseHeader(text[:end-cardSize], warn); err != nil {
		return hdu, err
	}
	hdu.setName()
	hdu.dataOffset = offset + padded(int64(end))
	if hdu.dataSize, err = hdu.checkSize(warn); err != nil {
		return hdu, err
	}
	if missing := hdu.dataOffset - f.size; missing > 0 {
		if hdu.dataSize == 0 {
			warn("the padding after the header is %d bytes short", missing)
		}
		hdu.dataOffset = f.size
	}
	if have := f.size - hdu.dataOffset; hdu.dataSize > have {
		return hdu, fmt.Errorf("the file is cut short or the header is damaged: the data need %d bytes, but %d are missing", hdu.dataSize, hdu.dataSize-have)
	} else if short := padded(hdu.dataSize) - have; short > 0 && have > 0 {
		warn("the padding after the data is %d bytes short", short)
	}
	return hdu, hdu.describe(warn)
}

// headerText returns the records of the header at offset, END included.
func (f *File) headerText(offset int64) (string, error) {
	var block [blockSize]byte
	for at := offset; ; at += blockSize {
		b := block[:min(blockSize, f.size-at)]
		if n, err := f.r.ReadAt(b, at); n < len(b) {
			return "", fmt.Errorf("reading the header: %w", err)
		}
		for i := 0; i+cardSize <= len(b); i += cardSize {
			if string(b[i:i+10]) != "END       " {
				continue
			}
			text := make([]byte, at-offset+int64(i)+cardSize)
			if n, err := f.r.ReadAt(text, offset); n < len(text) {
				return "", fmt.Errorf("reading the header: %w", err)
			}
			return string(text), nil
		}
		if at+blockSize >= f.size {
			return "", fmt.Errorf("the header has no END: the file is cut short after %d bytes of it", f.size-offset)
		}
	}
}

// checkHeaderPadding looks at what stands between END, which ends at offset,
// and the end of its block. It should be spaces. NUL or text is somebody's
// carelessness; anything else means that the header was overwritten.
func (f *File) checkHeaderPadding(offset int64, warn func(string, ...any)) error {
	var block [blockSize]byte
	b := block[:min(padded(offset), f.size)-offset]
	if n, err := f.r.ReadAt(b, offset); n < len(b) {
		return fmt.Errorf("reading the header: %w", err)
	}
	rest := bytes.Trim(b, " ")
	if len(rest) == 0 {
		return nil
	}
	for _, c := range rest {
		if c != 0 && (c < ' ' || c > '~') {
			return fmt.Errorf("the header is damaged: byte 0x%02x stands between END and the end of the block, expected spaces", c)
		}
	}
	warn("something other than spaces stands between END and the end of the header's block")
	return nil
}

// HDU finds an HDU by its name (EXTNAME, letter case does not count), by name
// and version ("LC,2"), or by its number ("0" or "PRIMARY" is the first). Of
// several with one name the first is taken.
func (f *File) HDU(name string) (*HDU, error) {
	want, version, exact := cutVersion(name)
	known := make([]string, len(f.HDUs))
	for i, h := range f.HDUs {
		known[i] = h.Name
		if strings.EqualFold(h.Name, want) && (!exact || h.Version == version) {
			return h, nil
		}
	}
	for _, h := range f.HDUs {
		if strings.EqualFold(h.Name, strings.TrimSpace(name)) {
			return h, nil // a name with a comma in it
		}
	}
	if n, err := strconv.Atoi(strings.TrimSpace(name)); err == nil && n >= 0 && n < len(f.HDUs) {
		return f.HDUs[n], nil
	}
	if len(f.HDUs) > 0 && strings.EqualFold(want, "PRIMARY") {
		return f.HDUs[0], nil
	}
	return nil, fmt.Errorf("fits: no HDU %.40q; the file has %s%s", name, f.list(), nearest.Hint(want, known))
}

// cutVersion splits "LC,2".
func cutVersion(name string) (want string, version int64, exact bool) {
	want, digits, found := strings.Cut(name, ",")
	version, err := strconv.ParseInt(strings.TrimSpace(digits), 10, 64)
	return strings.TrimSpace(want), version, found && err == nil
}

// list names the file's HDUs, the first twenty of them.
func (f *File) list() string {
	var names []string
	for i, h := range f.HDUs {
		if i == 20 {
			names = append(names, fmt.Sprintf("and %d more", len(f.HDUs)-i))
			break
		}
		names = append(names, h.Label())
	}
	return strings.Join(names, ", ")
}

// Table finds a table as HDU does.
func (f *File) Table(name string) (*Table, error) {
	h, err := f.HDU(name)
	if err != nil {
		return nil, err
	}
	if h.Table == nil {
		return nil, fmt.Errorf("fits: %s is no table but holds %s", h.Label(), h.Type)
	}
	return h.Table, nil
}

// Image finds an image as HDU does.
func (f *File) Image(name string) (*Image, error) {
	h, err := f.HDU(name)
	if err != nil {
		return nil, err
	}
	if h.Image == nil {
		return nil, fmt.Errorf("fits: %s is no image but holds %s", h.Label(), h.Type)
	}
	return h.Image, nil
}

// mul multiplies sizes; ok is false when the product does not fit.
func mul(a, b int64) (product int64, ok bool) {
	if a < 0 || b < 0 {
		return 0, false
	}
	hi, lo := bits.Mul64(uint64(a), uint64(b))
	return int64(lo), hi == 0 && lo < 1<<63
}

// add adds sizes; ok is false when the sum does not fit.
func add(a, b int64) (sum int64, ok bool) {
	sum = a + b
	return sum, a >= 0 && b >= 0 && sum >= 0
}
