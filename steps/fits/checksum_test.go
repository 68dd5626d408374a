package fits

import (
	"bytes"
	"strings"
	"testing"
)

func TestChecksumVectors(t *testing.T) {
	var vectors struct {
		Encode []struct {
			Value      uint32
			Complement string `json:"encoded_complement"`
			Plain      string `json:"encoded_plain"`
		}
		Datasum []struct {
			Data    string
			Datasum uint32
		}
	}
	loadJSON(t, "checksum_vectors.json", &vectors)
	if len(vectors.Encode) == 0 || len(vectors.Datasum) == 0 {
		t.Fatal("no vectors")
	}
	for _, v := range vectors.Encode {
		if got := encodeChecksum(v.Value); got != v.Complement {
			t.Errorf("encodeChecksum(%d) = %s, expected %s", v.Value, got, v.Complement)
		}
		if got := encodeChecksum(^v.Value); got != v.Plain {
			t.Errorf("encodeChecksum(^%d) = %s, expected %s", v.Value, got, v.Plain)
		}
	}
	counting := make([]byte, blockSize)
	for i := range counting {
		counting[i] = byte(i)
	}
	data := map[string][]byte{
		"2880 zero bytes":               make([]byte, blockSize),
		"2880 spaces":                   bytes.Repeat([]byte{' '}, blockSize),
		"bytes 0..255 repeated to 2880": counting,
		"2880 bytes of 0xff":            bytes.Repeat([]byte{0xff}, blockSize),
		"first word 0xffffffff then 1":  {0xff, 0xff, 0xff, 0xff, 0, 0, 0, 1},
	}
	for _, v := range vectors.Datasum {
		b, ok := data[v.Data]
		if got := sum32(0, b); !ok || got != v.Datasum {
			t.Errorf("sum of %s = %d, expected %d", v.Data, got, v.Datasum)
		}
	}
}

func TestVerifyChecksums(t *testing.T) {
	for name, want := range map[string][]string{
		"06_checksum_ok.fits": nil,
		"27_bad_datasum.fits": {
			"HDU 2 (LC): the data do not match their DATASUM (2119874643 in the header, 3193616467 computed)",
			"HDU 2 (LC): the HDU does not match its CHECKSUM",
		},
	} {
		f, err := Read(sample(t, name))
		if err != nil {
			t.Fatal(err)
		}
		failed, err := f.VerifyChecksums()
		if err != nil || len(failed) != len(want) {
			t.Errorf("%s: %q, %v, expected %d messages", name, failed, err, len(want))
			continue
		}
		for i := range want {
			if !strings.HasPrefix(failed[i], want[i]) {
				t.Errorf("%s: %q, expected %q", name, failed[i], want[i])
			}
		}
	}
}

// TestChecksumSeesEveryByte flips single bits all over a file.
func TestChecksumSeesEveryByte(t *testing.T) {
	var w Writer
	if err := w.Image("", []int{3}, []float64{1, 2, 3}); err != nil {
		t.Fatal(err)
	}
	for i := blockSize; i < len(w.Bytes()); i += 7 {
		data := bytes.Clone(w.Bytes())
		data[i] ^= 4
		f, err := Read(data)
		if err != nil {
			t.Fatal(err)
		}
		if failed, err := f.VerifyChecksums(); err != nil || len(failed) != 2 {
			t.Fatalf("byte %d changed: %q, %v", i, failed, err)
		}
	}
}
