package canon

import (
	"encoding/hex"
	"encoding/json"
	"math"
	"os"
	"os/exec"
	"strings"
	"testing"
)

// peer decodes and encodes in canonical form with an independent
// implementation, python3-cbor2, and prints both as JSON.
const peer = `
import cbor2, json, sys
def plain(x):
    if isinstance(x, cbor2.CBORTag): return {"tag": x.tag, "hex": x.value.hex()}
    if isinstance(x, dict): return {str(k): plain(v) for k, v in x.items()}
    if isinstance(x, list): return [plain(v) for v in x]
    if isinstance(x, float): return repr(x)
    return x
for line in sys.stdin:
    x = cbor2.loads(bytes.fromhex(line))
    print(json.dumps([cbor2.dumps(x, canonical=True).hex(), plain(x)]))
`

// TestAgainstPython compares encodings with those of Debian's python3-cbor2.
// Without it the test is skipped, or fails when RIMLIGHT_REQUIRE=1.
func TestAgainstPython(t *testing.T) {
	const python = "/usr/bin/python3"
	if out, err := exec.Command(python, "-c", "import cbor2").CombinedOutput(); err != nil {
		if os.Getenv("RIMLIGHT_REQUIRE") == "1" {
			t.Fatalf("python3-cbor2 is needed: %v\n%s", err, out)
		}
		t.Skip("there is no python3-cbor2")
	}
	// maps with integer keys are left out: cbor2 sorts them by length first, as
	// RFC 7049 did
	values := []any{
		smallCube(), wide{Text: "τ", Nums: []float64{0.1}, F: 1e-9, F32: 0.1, I: -1 << 40, Bools: []bool{true}, ByInt: map[int8]Inner{5: {}}, Long: map[string]string{
			"b": "1", "aa": "2", "": "3", strings.Repeat("k", 30): "4", strings.Repeat("j", 300): "5"}},
		special, -1, uint64(math.MaxUint64), int64(math.MinInt64), strings.Repeat("x", 70000), make([]string, 300), map[string]float64{"x": math.Inf(1), "y": math.NaN()},
		struct{ Half, Single, Double, Zero float64 }{1.5, 100000, 1.1, math.Copysign(0, -1)},
	}
	var in strings.Builder
	var encoded [][]byte
	for _, v := range values {
		b, err := Marshal(v)
		if err != nil {
			t.Fatal(err)
		}
		encoded = append(encoded, b)
		in.WriteString(hex.EncodeToString(b) + "\n")
	}
	cmd := exec.Command(python, "-c", peer)
	cmd.Stdin = strings.NewReader(in.String())
	cmd.Stderr = os.Stderr
	out, err := cmd.Output()
	if err != nil {
		t.Fatal(err)
	}
	got := strings.Split(strings.TrimSpace(string(out)), "\n")
	if len(got) != len(values) {
		t.Fatalf("%d values of %d came back", len(got), len(values))
	}
	for i, line := range got {
		var pair [2]json.RawMessage
		if err := json.Unmarshal([]byte(line), &pair); err != nil {
			t.Fatal(err)
		}
		if want := `"` + hex.EncodeToString(encoded[i]) + `"`; string(pair[0]) != want {
			t.Errorf("%T: python encodes to %.200s, expected %.200s", values[i], pair[0], want)
		}
		if i == len(got)-1 {
			if want := `{"Half": "1.5", "Zero": "-0.0", "Double": "1.1", "Single": "100000.0"}`; string(pair[1]) != want {
				t.Errorf("python decodes %s, expected %s", pair[1], want)
			}
		}
	}
	// float64 1, NaN; -0, 2 in little endian
	if want := `"Flux": [{"tag": 86, "hex": "000000000000f03f000000000000f87f"}, {"tag": 86, "hex": "00000000000000800000000000000040"}]`; !strings.Contains(got[0], want) {
		t.Errorf("python decodes the cube to %s, expected %s in it", got[0], want)
	}
}
