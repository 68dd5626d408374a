package trial

import (
	"bufio"
	"bytes"
	"encoding/binary"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// massRecipe is a reduction as recipes of mass data are: read, clean, take
// apart, fit each channel (by two means, so that the machinery is what takes
// time), put together, show.
const massRecipe = `# Mass data

| input | file | layout | about |
|---|---|---|---|
| raw | raw.fits | light-curve table | extracted spectra |

| setting | value | unit | about |
|---|---|---|---|
| skip | 1 | min | left out at the start |
| begin | 0.4 | | of the transit, share of the series |
| end | 0.6 | | of the transit |

` + "```go" + `
// Clean masks and rescales.
func Clean(raw lightcurve.Cube, skip float64) (clean lightcurve.Cube, err error) {
	clean, err = lightcurve.SkipStart(raw, skip)
	if err != nil {
		return
	}
	clean, err = lightcurve.MaskOutliers(clean, lightcurve.RunningMedian{Window: 11, Sigma: 6})
	if err != nil {
		return
	}
	clean, _, err = lightcurve.RescaleErrors(clean)
	return
}

// White adds the channels up.
func White(clean lightcurve.Cube) (white lightcurve.Curve, err error) {
	return lightcurve.White(clean)
}

// Channels takes the cube apart.
func Channels(clean lightcurve.Cube) (channels []lightcurve.Curve) {
	channels = lightcurve.Curves(clean)
	return
}

// Depth compares the fluxes in and out of transit with the white light curve.
//
//each:channel in channels
func Depth(channel lightcurve.Curve, white lightcurve.Curve, begin, end float64) (point spectrum.Point, residual []float64, err error) {
	n := len(channel.Time)
	first, last := int(begin*float64(n)), int(end*float64(n))
	in, out, inside, outside := 0.0, 0.0, 0, 0
	for i := 0; i < n; i++ {
		if channel.Mask[i] != 0 {
			continue
		}
		if i >= first && i < last {
			in += channel.Flux[i]
			inside++
		} else {
			out += channel.Flux[i]
			outside++
		}
	}
	if inside == 0 || outside == 0 {
		err = fmt.Errorf("no usable sample in or out of transit")
		return
	}
	level := out / float64(outside)
	residual = make([]float64, n)
	for i := 0; i < n; i++ {
		residual[i] = channel.Flux[i]/level - white.Flux[i]
	}
	point = spectrum.Point{Channel: channel.Channel, Depth: 1 - in/float64(inside)/level, DepthErr: channel.Err[n/2] / level / math.Sqrt(float64(inside)), Used: inside + outside, Dof: inside + outside - 2}
	return
}

// Noise adds up what is left.
func Noise(residual [][]float64) (noise float64) {
	for j := 0; j < len(residual); j++ {
		noise += residual[j][0] * residual[j][0]
	}
	return
}

// Assemble makes the spectrum.
func Assemble(point []spectrum.Point) (depths spectrum.Spectrum, err error) {
	depths, err = spectrum.Assemble(point, nil)
	return
}
` + "```" + `
`

// writeMass writes a light-curve table of m channels and n integrations with a
// transit in it, a little of it at a time.
func writeMass(t testing.TB, path string, m, n int) {
	t.Helper()
	f, err := os.Create(path)
	if err != nil {
		t.Fatal(err)
	}
	w := bufio.NewWriterSize(f, 1<<20)
	written := 0
	pad := func(with byte) {
		for ; written%2880 != 0; written++ {
			w.WriteByte(with)
		}
	}
	card := func(format string, args ...any) {
		fmt.Fprintf(w, "%-80s", fmt.Sprintf(format, args...))
		written += 80
	}
	table := func(name string, rows, width int, columns ...string) {
		card("XTENSION= 'BINTABLE'")
		for _, c := range []string{"BITPIX  = 8", "NAXIS   = 2", fmt.Sprintf("NAXIS1  = %d", width), fmt.Sprintf("NAXIS2  = %d", rows), "PCOUNT  = 0", "GCOUNT  = 1", fmt.Sprintf("TFIELDS = %d", len(columns))} {
			card("%s", c)
		}
		for i, c := range columns {
			label, form, _ := strings.Cut(c, " ")
			card("%-8s= '%s'", fmt.Sprintf("TTYPE%d", i+1), label)
			card("%-8s= '%s'", fmt.Sprintf("TFORM%d", i+1), form)
		}
		card("EXTNAME = '%s'", name)
		card("END")
		pad(' ')
	}
	number := func(x float64) {
		var b [8]byte
		binary.BigEndian.PutUint64(b[:], math.Float64bits(x))
		w.Write(b[:])
		written += 8
	}
	for _, c := range []string{"SIMPLE  =                    T", "BITPIX  = 8", "NAXIS   = 0", "EXTEND  =                    T", "END"} {
		card("%s", c)
	}
	pad(' ')
	table("LIGHTCURVES", n, 8*(3+2*m), "TIME 1D", fmt.Sprintf("FLUX %dD", m), fmt.Sprintf("FLUX_ERR %dD", m), "X 1D", "Y 1D")
	rng := rand.New(rand.NewPCG(uint64(m), uint64(n)))
	for i := range n {
		depth := 0.0
		if i >= n*2/5 && i < n*3/5 {
			depth = 0.01
		}
		number(2460000.5 + float64(i)*10/86400)
		for j := range m {
			number(1000 * (1 - depth*(1+0.1*math.Sin(float64(j)))) * (1 + 0.001*rng.NormFloat64()))
		}
		for range m {
			number(1)
		}
		number(rng.NormFloat64())
		number(rng.NormFloat64())
	}
	pad(0)
	table("CHANNELS", m, 16, "WAVE_LO 1D", "WAVE_HI 1D")
	for j := range m {
		number(1 + float64(j)*1e-3)
		number(1 + float64(j+1)*1e-3)
	}
	pad(0)
	if err := w.Flush(); err != nil {
		t.Fatal(err)
	}
	if err := f.Close(); err != nil {
		t.Fatal(err)
	}
}

// A mass is a bench with the recipe for mass data.
type mass struct {
	*bench
	raw int64 // bytes of its fluxes and errors
}

func newMass(t testing.TB, m, n int) *mass {
	b := newBench(t)
	if m*n > 10_000_000 { // not into memory, which is what is measured
		b = &bench{t: t, dir: t.TempDir(), exe: b.exe}
		b.store, b.out = filepath.Join(b.dir, "rimlight.store"), filepath.Join(b.dir, "r.out")
	}
	b.write("r.md", massRecipe)
	writeMass(t, filepath.Join(b.dir, "raw.fits"), m, n)
	return &mass{b, int64(m) * int64(n) * 16}
}

// measured runs a command and gives the most memory that it and its children
// were resident with together, in bytes; what they share counts for each of
// them. Seen is told each moment.
func measured(t testing.TB, c *exec.Cmd, seen func()) (peak int64) {
	t.Helper()
	var said bytes.Buffer
	c.Stderr = &said
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	done := make(chan error, 1)
	go func() { done <- c.Wait() }()
	for {
		select {
		case err := <-done:
			if err != nil {
				t.Logf("%v: %s", err, said.String())
			}
			return peak
		case <-time.After(5 * time.Millisecond):
			sum := resident(c.Process.Pid)
			for _, pid := range children(c.Process.Pid) {
				sum += resident(pid)
			}
			peak = max(peak, sum)
			if seen != nil {
				seen()
			}
		}
	}
}

// resident is the memory, in bytes, that a process is resident with, 0 when it
// is gone.
func resident(pid int) (kib int64) {
	b, err := os.ReadFile(fmt.Sprintf("/proc/%d/status", pid))
	if err != nil {
		return 0
	}
	_, rest, _ := strings.Cut(string(b), "VmRSS:")
	fmt.Sscan(rest, &kib)
	return kib << 10
}

// massFloor is what parent and workers take besides the data: the program
// itself in each of three processes, its interpreter with what it knows of the
// library, and garbage that may lie about.
const massFloor = 400 << 20

// TestMass reduces a cube and holds that parent and workers together stay below
// three times its fluxes and errors, that an interruption loses no more than
// what was under way, and that known results take no more memory than others.
// RIMLIGHT_MASS asks for another size, such as 2048x20000.
func TestMass(t *testing.T) {
	if testing.Short() {
		t.Skip("a cube")
	}
	m, n := 256, 5000
	if size := os.Getenv("RIMLIGHT_MASS"); size != "" {
		if _, err := fmt.Sscanf(size, "%dx%d", &m, &n); err != nil {
			t.Fatalf("RIMLIGHT_MASS=%s: expected CHANNELSxINTEGRATIONS", size)
		}
	}
	b := newMass(t, m, n)
	limit := 3*b.raw + massFloor
	hold := func(what string, c *exec.Cmd, peak int64, began time.Time) {
		s := c.ProcessState
		t.Logf("%s: %.0f MB at most, %.2f times the data, in %v; the parent, without its workers, took %v of processor time", what, float64(peak)/1e6, float64(peak)/float64(b.raw),
			time.Since(began).Round(10*time.Millisecond), (s.UserTime() + s.SystemTime()).Round(10*time.Millisecond))
		if peak > limit {
			t.Errorf("%s: %d bytes of memory, expected at most %d for %d bytes of data", what, peak, limit, b.raw)
		}
	}

	// Interrupted in the middle of the fan-out.
	began := time.Now()
	c := b.command("--json")
	var out bytes.Buffer
	c.Stdout = &out
	stopped := false
	peak := measured(t, c, func() {
		if at := elementsDone(b.store); !stopped && at >= m/2 {
			stopped = true
			c.Process.Signal(syscall.SIGINT)
		}
	})
	hold("interrupted", c, peak, began)
	if status := c.ProcessState.ExitCode(); status != 130 && status != 0 {
		t.Fatalf("exit status %d after an interruption; it said\n%s", status, out.String())
	}
	kept := elementsDone(b.store)

	began = time.Now()
	c = b.command("--json")
	out.Reset()
	c.Stdout = &out
	peak = measured(t, c, nil)
	hold("resumed", c, peak, began)
	if status := c.ProcessState.ExitCode(); status != 0 {
		t.Fatalf("exit status %d; it said\n%s", status, out.String())
	}
	first := -1
	for line := range strings.Lines(out.String()) {
		var e event
		if json.Unmarshal([]byte(line), &e) == nil && e.Name == "Depth" && first < 0 {
			first = e.Done
		}
	}
	t.Logf("%d of %d elements were kept before the interruption, %d were taken up", kept, m, first)
	if first < kept {
		t.Errorf("of %d elements in the store, %d were taken up", kept, first)
	}

	began = time.Now()
	c = b.command("--json")
	c.Stdout = nil
	peak = measured(t, c, nil)
	hold("known", c, peak, began)
	if status := c.ProcessState.ExitCode(); status != 0 {
		t.Fatalf("exit status %d when everything was known", status)
	}
	t.Logf("the store takes %s", diskUse(b.store))
}

// elementsDone counts the records of elements of the fan-out.
func elementsDone(store string) int {
	files, _ := filepath.Glob(filepath.Join(store, "records", "*", "*"))
	const others = 4 // raw, Clean, White, Channels
	return max(0, len(files)-others)
}

func diskUse(dir string) string {
	out, err := exec.Command("du", "-sm", dir).Output()
	if err != nil {
		return "?"
	}
	mb, _, _ := strings.Cut(string(out), "\t")
	n, _ := strconv.Atoi(mb)
	return fmt.Sprintf("%d MiB", n)
}
