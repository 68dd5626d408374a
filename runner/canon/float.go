package canon

import (
	"encoding/binary"
	"math"
)

// appendFloat appends a float in the shortest of the three widths that keeps
// its value.
func appendFloat(dst []byte, x float64) []byte {
	if x != x {
		return binary.BigEndian.AppendUint16(append(dst, 0xf9), nan16)
	}
	single := float32(x)
	if float64(single) != x {
		return binary.BigEndian.AppendUint64(append(dst, 0xfb), math.Float64bits(x))
	}
	if half, ok := toHalf(single); ok {
		return binary.BigEndian.AppendUint16(append(dst, 0xf9), half)
	}
	return binary.BigEndian.AppendUint32(append(dst, 0xfa), math.Float32bits(single))
}

// toHalf gives the IEEE 754 binary16 form of x; false if x has none or is NaN.
func toHalf(x float32) (uint16, bool) {
	bits := math.Float32bits(x)
	sign := uint16(bits>>16) & 0x8000
	exponent, fraction := int(bits>>23&0xff)-127, bits&(1<<23-1)
	switch {
	case bits<<1 == 0:
		return sign, true
	case exponent == 128:
		return sign | 0x7c00, fraction == 0
	case exponent >= -14 && exponent <= 15:
		return sign | uint16(exponent+15)<<10 | uint16(fraction>>13), fraction&(1<<13-1) == 0
	case exponent >= -24 && exponent < -14: // a multiple of 2^-24, with fewer than 10 bits
		shift := 13 - 14 - exponent
		fraction |= 1 << 23
		return sign | uint16(fraction>>shift), fraction&(1<<shift-1) == 0
	}
	return 0, false
}

// fromHalf gives the value of an IEEE 754 binary16.
func fromHalf(h uint16) float64 {
	exponent, fraction := int(h>>10&0x1f), float64(h&0x3ff)
	var x float64
	switch exponent {
	case 0:
		x = math.Ldexp(fraction, -24)
	case 31:
		if fraction != 0 {
			return math.NaN()
		}
		x = math.Inf(1)
	default:
		x = math.Ldexp(1024+fraction, exponent-25)
	}
	if h&0x8000 != 0 {
		return math.Copysign(x, -1)
	}
	return x
}
