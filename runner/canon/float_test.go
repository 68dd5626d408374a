package canon

import (
	"encoding/binary"
	"math"
	"testing"
)

// TestHalves takes every half-precision number to a float64 and back.
func TestHalves(t *testing.T) {
	for h := range 1 << 16 {
		x := fromHalf(uint16(h))
		b := appendFloat(nil, x)
		want := uint16(h)
		if x != x {
			want = nan16
		}
		if len(b) != 3 || binary.BigEndian.Uint16(b[1:]) != want {
			t.Fatalf("half %#04x is %v, which was encoded to %x", h, x, b)
		}
	}
	// the extremes of binary16 and their neighbours, from IEEE 754
	for x, n := range map[float64]int{
		65504: 3, 65505: 5, 65520: 5, 0x1p-24: 3, 0x1p-25: 5, 0x1.8p-24: 5, 0x1p-14: 3, 0x1.ffcp-15: 5, 0x1.ff8p-15: 3,
		0x1.004p0: 3, 0x1.002p0: 5, math.MaxFloat32: 5, 0x1p-149: 5, 0x1p-150: 9, 0x1p128: 9, 0x1.000001p0: 9, math.Pi: 9,
		math.Inf(-1): 3, 0x1.fep-127: 5,
	} {
		if b := appendFloat(nil, x); len(b) != n {
			t.Errorf("%v (%x) takes %d bytes, expected %d", x, x, len(b), n)
		}
	}
}
