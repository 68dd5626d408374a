package trial

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// TestDamage flips a bit of 500 files of a store, or cuts them short, many at a
// time and one alone, and holds that verifying names each, that the next run
// names each and computes again what it has to, and that nothing differs then
// from the store of an undisturbed run.
func TestDamage(t *testing.T) {
	batches := []int{1}
	for range 11 {
		batches = append(batches, 1)
	}
	for range 4 {
		batches = append(batches, 122)
	}
	if testing.Short() {
		batches = []int{1, 60, 1}
	}
	want := undisturbed(t)
	b := newBench(t)
	b.run(0)
	rng := rand.New(rand.NewPCG(5, 500))
	kinds := map[string]int{}
	for round, n := range batches {
		files := filesBelow(t, b.store)
		rng.Shuffle(len(files), func(i, j int) { files[i], files[j] = files[j], files[i] })
		if round == 0 { // there is but one of these
			files = []string{filepath.Join(b.store, "rimlight-store")}
		}
		var spoiled []string
		marked := false
		for _, file := range files {
			kind := strings.SplitN(strings.TrimPrefix(file, b.store+"/"), "/", 2)[0]
			if kind == "README.txt" { // one of the two tells what the other should be
				kind = "rimlight-store"
			}
			if len(spoiled) == n || kind == "damaged" || kind == "rimlight-store" && marked {
				continue
			}
			marked = marked || kind == "rimlight-store"
			how := spoil(t, rng, file)
			kinds[kind]++
			spoiled = append(spoiled, file+how)
		}
		verified := b.verify(1)
		says(t, verified, fmt.Sprint(n, " damaged"))
		said := b.run(0)
		for _, s := range spoiled {
			file, how, _ := strings.Cut(s, ": ")
			if !strings.Contains(verified, file) {
				t.Errorf("verifying does not find %s: %s", file, how)
			}
			if !strings.Contains(said, file) {
				t.Errorf("no run says a word of %s: %s", file, how)
			}
		}
		says(t, b.verify(0), "0 damaged", fmt.Sprint(len(filesBelow(t, filepath.Join(b.store, "damaged"))), " hints"))
		if n > 1 || round == 0 { // of every single file it would take long
			treeOf(b).equal(t, want)
		}
		if t.Failed() {
			t.Fatalf("in round %d, the run said\n%.2000s", round, said)
		}
	}
	t.Log(kinds)
	if kinds["objects"] < 30 || kinds["records"] < 15 {
		t.Errorf("damaged were %v", kinds)
	}
}

// spoil flips a bit of a file or cuts it short, and says what it did.
func spoil(t testing.TB, rng *rand.Rand, file string) string {
	t.Helper()
	data, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	how := ""
	if rng.IntN(3) == 0 {
		n := rng.IntN(len(data))
		how = fmt.Sprintf(": cut from %d to %d bytes", len(data), n)
		data = data[:n]
	} else {
		bit := rng.IntN(8 * len(data))
		how = fmt.Sprintf(": bit %d flipped", bit)
		data[bit/8] ^= 1 << (bit % 8)
	}
	os.Chmod(file, 0o644)
	if err := os.WriteFile(file, data, 0o644); err != nil {
		t.Fatal(err)
	}
	return how
}
