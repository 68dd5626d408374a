package command

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"time"

	"github.com/spf13/cobra"

	"rimlight/recipes"
	"rimlight/steps/lightcurve"
	"rimlight/steps/simulate"
	"rimlight/steps/spectrum"
)

// demoSeed makes the demo's data the same everywhere.
const demoSeed = 1

func (a *app) demoCommand() *cobra.Command {
	var o options
	seed := uint64(demoSeed)
	c := &cobra.Command{
		Use:   "demo DIR",
		Short: "Write a demo recipe and simulated raw data with a known spectrum, and run it",
		Long: `Demo writes the recipe continuous.md, simulated raw data visit.fits and their
truth, truth.csv, into DIR, runs the recipe, and compares the spectrum that
comes out with the one that was put in. Star, planet and instrument are
invented.` + exitHelp,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error { return a.demo(c.Context(), args[0], seed, &o) },
	}
	o.flags(c)
	c.Flags().Uint64Var(&seed, "seed", seed, "of the simulated noise")
	return c
}

func (a *app) demo(ctx context.Context, dir string, seed uint64, o *options) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return err
	}
	recipe := filepath.Join(dir, "continuous.md")
	if err := keepOwn(recipe, recipes.Continuous()); err != nil {
		return err
	}
	began := time.Now()
	cube, truth, err := simulate.Make(simulate.Continuous(seed))
	if err != nil {
		return err
	}
	raw, err := lightcurve.WriteFITS(cube)
	if err != nil {
		return err
	}
	truthTable, err := truth.CSV()
	if err != nil {
		return err
	}
	for name, data := range map[string][]byte{"visit.fits": raw, "truth.csv": truthTable} {
		if err := os.WriteFile(filepath.Join(dir, name), data, 0o666); err != nil {
			return err
		}
	}
	if !o.quiet && !o.json {
		fmt.Fprintf(a.stderr, "simulated %d integrations of %d channels in %s\n", len(cube.Time), len(cube.Channels), time.Since(began).Round(10*time.Millisecond))
	}
	err = a.run(ctx, recipe, o)
	var e *exit
	if errors.As(err, &e) && e.status != ExitCheckFailed {
		return err
	}
	b, readErr := os.ReadFile(filepath.Join(o.out, csvFile))
	if readErr != nil {
		return errors.Join(err, readErr)
	}
	s, readErr := spectrum.ReadCSV(b)
	if readErr != nil {
		return errors.Join(err, readErr)
	}
	n, mean, rms := pulls(s, truth)
	switch {
	case o.json:
		writeJSON(a.stdout, map[string]any{"event": "truth", "channels": n, "mean_pull": mean, "rms_pull": rms})
	case !o.quiet:
		fmt.Fprintf(a.stdout, "%-22s %d channels differ from what was put in by %.2f sigma in the mean, %.2f rms\n", "against the truth", n, mean, rms)
	}
	return err
}

// keepOwn writes a file, unless there is one with other content: that one may
// be somebody's work.
func keepOwn(path string, data []byte) error {
	old, err := os.ReadFile(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return os.WriteFile(path, data, 0o666)
	case err != nil:
		return err
	case !bytes.Equal(old, data):
		return fmt.Errorf("%s exists and is not the shipped recipe: choose another folder, or run it with rimlight run", path)
	}
	return nil
}

// pulls compares a spectrum with the truth: the number of channels with a
// depth, the mean of (depth - truth)/error, and the root of its mean square.
func pulls(s spectrum.Spectrum, truth simulate.Truth) (n int, mean, rms float64) {
	depth := map[int]float64{}
	for i, c := range truth.Channels {
		depth[c.Index] = truth.Depth[i]
	}
	errs := s.Errors()
	for i, p := range s.Points {
		want, ok := depth[p.Channel.Index]
		if !p.Good() || !ok {
			continue
		}
		pull := (p.Depth - want) / errs[i]
		n++
		mean += pull
		rms += pull * pull
	}
	return n, mean / float64(n), math.Sqrt(rms / float64(n))
}
