package fits

import (
	"encoding/binary"
	"fmt"
	"strconv"
	"strings"
)

// sum32 adds big-endian 32-bit words to a ones-complement sum (FITS 4.0
// section 4.4.2.7). Bytes missing from the last word count as zero.
func sum32(sum uint32, data []byte) uint32 {
	total := uint64(sum)
	for len(data) >= 4 {
		total += uint64(binary.BigEndian.Uint32(data))
		data = data[4:]
	}
	if len(data) > 0 {
		var last [4]byte
		copy(last[:], data)
		total += uint64(binary.BigEndian.Uint32(last[:]))
	}
	for total>>32 != 0 {
		total = total&0xffffffff + total>>32
	}
	return uint32(total)
}

// encodeChecksum writes the complement of a sum as 16 letters and digits which,
// put into the header from column 12 on, make the whole HDU sum to all ones
// (FITS 4.0 appendix J).
func encodeChecksum(sum uint32) string {
	complement := ^sum
	var code [16]byte
	for i := range 4 {
		b := byte(complement >> (24 - 8*i))
		// Four characters whose excess over '0' adds up to b.
		var group [4]byte
		for j := range group {
			group[j] = '0' + b/4
		}
		group[0] += b % 4
		// Shift pairs apart until no punctuation is left; sums stay the same.
		for changed := true; changed; {
			changed = false
			for j := 0; j < 4; j += 2 {
				for isPunctuation(group[j]) || isPunctuation(group[j+1]) {
					group[j]++
					group[j+1]--
					changed = true
				}
			}
		}
		for j := range group {
			code[4*j+i] = group[j]
		}
	}
	// The value starts in column 12, one byte before a word: rotate right.
	return string(code[15:]) + string(code[:15])
}

// isPunctuation tells the characters between digits, upper-case and lower-case
// letters that a checksum must not contain.
func isPunctuation(c byte) bool {
	return ':' <= c && c <= '@' || '[' <= c && c <= '`'
}

// VerifyChecksums reads the whole file and compares it with its DATASUM and
// CHECKSUM keywords. It returns one message for each that does not match; HDUs
// without these keywords are passed over. The error says that the file could
// not be read.
func (f *File) VerifyChecksums() ([]string, error) {
	var failed []string
	for _, h := range f.HDUs {
		if !h.Header.Has("DATASUM") && !h.Header.Has("CHECKSUM") {
			continue
		}
		header, err := f.sumRange(h.offset, h.dataOffset)
		if err != nil {
			return failed, err
		}
		end := min(h.dataOffset+padded(h.dataSize), f.size)
		data, err := f.sumRange(h.dataOffset, end)
		if err != nil {
			return failed, err
		}
		if h.Header.Has("DATASUM") {
			card, _ := h.Header.Lookup("DATASUM")
			want, err := strconv.ParseUint(strings.Trim(card.Text, " "), 10, 32)
			if err != nil || uint32(want) != data {
				failed = append(failed, fmt.Sprintf("%s: the data do not match their DATASUM (%.20s in the header, %d computed): they were changed or damaged after it was written", h.Label(), card.Text, data))
			}
		}
		if total := sumWords(header, data); h.Header.Has("CHECKSUM") && total != 0xffffffff && total != 0 {
			failed = append(failed, fmt.Sprintf("%s: the HDU does not match its CHECKSUM: it was changed or damaged after it was written", h.Label()))
		}
	}
	return failed, nil
}

// sumWords adds two sums.
func sumWords(a, b uint32) uint32 {
	return sum32(a, []byte{byte(b >> 24), byte(b >> 16), byte(b >> 8), byte(b)})
}

// sumRange sums the bytes of the file from start to end.
func (f *File) sumRange(start, end int64) (uint32, error) {
	sum := uint32(0)
	buffer := make([]byte, min(chunkSize, end-start)) // chunkSize is a multiple of 4
	for at := start; at < end; {
		b := buffer[:min(int64(len(buffer)), end-at)]
		if n, err := f.r.ReadAt(b, at); n < len(b) {
			return 0, fmt.Errorf("fits: reading byte %d: %w", at, err)
		}
		sum = sum32(sum, b)
		at += int64(len(b))
	}
	return sum, nil
}
