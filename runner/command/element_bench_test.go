package command

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"testing"
	"time"
)

// fanOut is a recipe of which the elements cost nothing but themselves.
const fanOut = `# Elements

| setting | value | unit | about |
|---|---|---|---|
| count | %d | | elements |

` + "```go" + `
// List makes elements.
func List(count int) (items []float64) {
	for i := 0; i < count; i++ {
		items = append(items, float64(i))
	}
	return
}

// Square is computed for each.
//
//each:item in items
func Square(item float64) (squared float64) {
	squared = item * item
	return
}

// Sum adds up.
func Sum(squared []float64) (sum float64) {
	for _, s := range squared {
		sum += s
	}
	return
}
` + "```" + `
`

// BenchmarkElement is what one more element of a fan-out costs, all in: its
// key, its way to a worker that is there already and back, its result and its
// record on disk, its line in the report and in run.json. It is the difference
// between a run with 2000 elements more and one without, from the start of the
// process to the end. On a machine that is busy with other things, processor time
// says more than time.
func BenchmarkElement(b *testing.B) {
	const few, many = 20, 2020
	dir := b.TempDir()
	run := func(count, n int) (busy, took time.Duration) {
		recipe := filepath.Join(dir, "r.md")
		if err := os.WriteFile(recipe, fmt.Appendf(nil, fanOut, count), 0o644); err != nil {
			b.Fatal(err)
		}
		c := rimlight(b, "run", recipe, "--quiet", "--store", filepath.Join(dir, fmt.Sprintf("store-%d-%d", n, count)))
		var errs bytes.Buffer
		c.Stderr = &errs
		began := time.Now()
		if err := c.Run(); err != nil {
			b.Fatalf("%v: %s", err, errs.String())
		}
		return c.ProcessState.UserTime() + c.ProcessState.SystemTime(), time.Since(began)
	}
	var busy, took time.Duration
	n := 0
	for b.Loop() {
		n++
		lessBusy, lessTook := run(few, n)
		moreBusy, moreTook := run(many, n)
		busy, took = busy+moreBusy-lessBusy, took+moreTook-lessTook
	}
	elements := float64(n) * (many - few)
	b.ReportMetric(busy.Seconds()*1e3/elements, "cpu-ms/element")
	b.ReportMetric(took.Seconds()*1e3/elements, "ms/element")
	b.ReportMetric(0, "ns/op") // of both runs together says nothing
}
