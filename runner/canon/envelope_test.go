package canon

import (
	"bytes"
	"strings"
	"testing"
)

func TestEnvelope(t *testing.T) {
	sealed := Seal("lightcurve.Channel", "struct{Index int}", []byte{0x01})
	// 55799, an array of 5, the name of the format, its version
	if want := unhex(t, "d9d9f7 85 6e"+"72696d6c696768742076616c7565"+"01"); !bytes.HasPrefix(sealed, want) {
		t.Errorf("the envelope begins with %x, expected %x", sealed[:len(want)], want)
	}
	typ, layout, value, err := Open(sealed)
	if err != nil || typ != "lightcurve.Channel" || layout != "struct{Index int}" || !bytes.Equal(value, []byte{0x01}) {
		t.Errorf("%q, %q, %x, %v", typ, layout, value, err)
	}
	for n := range sealed {
		if _, _, _, err := Open(sealed[:n]); err == nil {
			t.Errorf("the first %d of %d bytes were accepted", n, len(sealed))
		}
	}
	later := bytes.Clone(sealed)
	later[19] = 2
	if _, _, _, err := Open(later); err == nil || !strings.Contains(err.Error(), "version 2, but this program knows version 1 only") {
		t.Errorf("an envelope of a later version: %v", err)
	}
	for _, other := range []string{"", "SIMPLE  =", "d9d9f7", "\x80", "\xa0", "\x18\x05"} {
		if _, _, _, err := Open([]byte(other)); err == nil || !strings.Contains(err.Error(), "no value of rimlight's") {
			t.Errorf("%q: %v", other, err)
		}
	}
}
