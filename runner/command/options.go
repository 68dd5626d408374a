package command

import (
	"fmt"
	"path/filepath"
	"runtime"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"rimlight/runner/confine"
	"rimlight/runner/slurm"
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// options are the flags that run, check and demo share.
type options struct {
	in, set    []string
	out, store string
	reserve    size // of the store's disk
	storeSize  size
	jobs       int
	on         string
	slurm      slurm.Options
	given      *pflag.FlagSet
	quiet      bool
	json       bool
	noGaps     bool
	why        string   // of run and check
	again      []string // of run
	limits     worker.Options
	confined   confine.Report // what prepare found out
}

func (o *options) flags(c *cobra.Command) {
	f := c.Flags()
	o.given = f
	f.StringArrayVar(&o.in, "in", nil, "read an input from another file: `NAME=PATH` (CSV: NAME=PATH;CHANNELS-PATH)")
	f.StringArrayVar(&o.set, "set", nil, "give a setting another value: `NAME=VALUE`")
	f.StringVar(&o.out, "out", "", "write the report and its tables into `DIR` (default: beside the recipe, its name with .out)")
	f.StringVar(&o.store, "store", "", "keep results in the store `DIR` (default: rimlight.store beside the recipe)")
	o.reserve = store.DefaultReserve
	f.Var(&o.reserve, "reserve", "stop when keeping a result would leave less than `SIZE` free on the disk of the store")
	f.Var(&o.storeSize, "store-size", "stop when the results in the store would take up more than `SIZE`; 0 for no limit")
	f.IntVar(&o.jobs, "jobs", runtime.NumCPU(), "worker processes at a time")
	f.StringVar(&o.on, "on", local, "where to compute: local, or slurm (a cluster that shares the folders of store and report)")
	o.slurmFlags(f)
	o.limitFlags(f)
	f.BoolVar(&o.noGaps, "no-gaps", false, "fail a step when one of its elements fails, instead of leaving a flagged gap")
	f.BoolVar(&o.quiet, "quiet", false, "say nothing but errors")
	f.BoolVar(&o.json, "json", false, "events for programs on standard output, one JSON object per line")
}

// defaults are the options without a flag given.
func defaults() *options {
	var o options
	o.flags(&cobra.Command{})
	return &o
}

// resolve checks the flags and fills in what depends on the recipe's place.
func (o *options) resolve(recipe string) error {
	if err := o.checkPlace(); err != nil {
		return err
	}
	if o.jobs < 1 {
		return fmt.Errorf("--jobs %d: expected at least 1", o.jobs)
	}
	if err := o.checkLimits(); err != nil {
		return err
	}
	stem := strings.TrimSuffix(recipe, filepath.Ext(recipe))
	if o.out == "" {
		o.out = stem + ".out"
	}
	if o.store == "" {
		o.store = filepath.Join(filepath.Dir(recipe), "rimlight.store")
	}
	return nil
}

// named splits NAME=VALUE flags.
func named(flag string, given []string) (map[string]string, error) {
	out := map[string]string{}
	for _, g := range given {
		name, value, ok := strings.Cut(g, "=")
		if !ok || name == "" {
			return nil, fmt.Errorf("--%s %s: expected NAME=VALUE", flag, g)
		}
		if _, twice := out[name]; twice {
			return nil, fmt.Errorf("--%s %s: given twice", flag, name)
		}
		out[name] = value
	}
	return out, nil
}

// inputs are the files of --in flags.
func (o *options) inputs() (map[string][]string, error) {
	given, err := named("in", o.in)
	if err != nil {
		return nil, err
	}
	out := map[string][]string{}
	for name, value := range given {
		for _, p := range strings.Split(value, ";") {
			out[name] = append(out[name], strings.TrimSpace(p))
		}
	}
	return out, nil
}
