package fits

import (
	"encoding/binary"
	"fmt"
	"math"
	"strings"
)

// A field knows how the elements of a slice are stored.
type field struct {
	code   byte    // type letter of a binary table
	bitpix int64   // type of an image's pixels; 0 when an image cannot hold them
	size   int     // bytes of an element
	length int     // elements
	width  int     // elements in a row
	zero   float64 // offset of the stored integers

	// put appends element i as stored.
	put func(b []byte, i int) []byte
}

// newField describes a slice.
func newField(values any) (field, error) {
	be := binary.BigEndian
	switch v := values.(type) {
	case []bool:
		return field{code: 'L', size: 1, length: len(v), put: func(b []byte, i int) []byte {
			if v[i] {
				return append(b, 'T')
			}
			return append(b, 'F')
		}}, nil
	case []uint8:
		return field{code: 'B', bitpix: 8, size: 1, length: len(v), put: func(b []byte, i int) []byte {
			return append(b, v[i])
		}}, nil
	case []int8:
		return field{code: 'B', bitpix: 8, size: 1, length: len(v), zero: -128, put: func(b []byte, i int) []byte {
			return append(b, uint8(v[i])^0x80)
		}}, nil
	case []int16:
		return field{code: 'I', bitpix: 16, size: 2, length: len(v), put: func(b []byte, i int) []byte {
			return be.AppendUint16(b, uint16(v[i]))
		}}, nil
	case []uint16:
		return field{code: 'I', bitpix: 16, size: 2, length: len(v), zero: 1 << 15, put: func(b []byte, i int) []byte {
			return be.AppendUint16(b, v[i]^1<<15)
		}}, nil
	case []int32:
		return field{code: 'J', bitpix: 32, size: 4, length: len(v), put: func(b []byte, i int) []byte {
			return be.AppendUint32(b, uint32(v[i]))
		}}, nil
	case []uint32:
		return field{code: 'J', bitpix: 32, size: 4, length: len(v), zero: 1 << 31, put: func(b []byte, i int) []byte {
			return be.AppendUint32(b, v[i]^1<<31)
		}}, nil
	case []int64:
		return field{code: 'K', bitpix: 64, size: 8, length: len(v), put: func(b []byte, i int) []byte {
			return be.AppendUint64(b, uint64(v[i]))
		}}, nil
	case []uint64:
		return field{code: 'K', bitpix: 64, size: 8, length: len(v), zero: unsignedOffset, put: func(b []byte, i int) []byte {
			return be.AppendUint64(b, v[i]^unsignedOffset)
		}}, nil
	case []float32:
		return field{code: 'E', bitpix: -32, size: 4, length: len(v), put: func(b []byte, i int) []byte {
			return be.AppendUint32(b, math.Float32bits(v[i]))
		}}, nil
	case []float64:
		return field{code: 'D', bitpix: -64, size: 8, length: len(v), put: func(b []byte, i int) []byte {
			return be.AppendUint64(b, math.Float64bits(v[i]))
		}}, nil
	case []complex64:
		return field{code: 'C', size: 8, length: len(v), put: func(b []byte, i int) []byte {
			b = be.AppendUint32(b, math.Float32bits(real(v[i])))
			return be.AppendUint32(b, math.Float32bits(imag(v[i])))
		}}, nil
	case []complex128:
		return field{code: 'M', size: 16, length: len(v), put: func(b []byte, i int) []byte {
			b = be.AppendUint64(b, math.Float64bits(real(v[i])))
			return be.AppendUint64(b, math.Float64bits(imag(v[i])))
		}}, nil
	case []string:
		return stringField(v)
	}
	return field{}, fmt.Errorf("values of type %T cannot be stored, expected a slice of numbers, strings or bool", values)
}

// stringField makes the field as long as the longest string; shorter ones end
// with NUL.
func stringField(v []string) (field, error) {
	size := 1
	for i, s := range v {
		s = strings.TrimRight(s, " ")
		for j := 0; j < len(s); j++ {
			if s[j] < ' ' || s[j] > '~' {
				return field{}, fmt.Errorf("text %d, %.40q, has characters that are not printable ASCII", i+1, s)
			}
		}
		size = max(size, len(s))
	}
	return field{code: 'A', size: size, length: len(v), put: func(b []byte, i int) []byte {
		s := strings.TrimRight(v[i], " ")
		b = append(b, s...)
		return append(b, make([]byte, size-len(s))...)
	}}, nil
}
