package command

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"sort"
	"strings"
	"time"

	"rimlight/runner/engine"
	"rimlight/runner/record"
	"rimlight/runner/store"
)

// An inventory is what a store holds, and who needs what of it.
type inventory struct {
	held    []holding // oldest first
	runs    []knownRun
	sizes   map[store.Hash]int64 // of all objects that records lead to
	derived map[store.Hash]bool  // objects of reports that no record leads to: what was put together from others
	flaws   []error              // why it may not be known who needs what
}

// A holding is a record in a store, the objects that it leads to, and who needs
// it.
type holding struct {
	store.Entry
	objects []store.Hash
	needed  []int // indexes into the inventory's runs
}

// A knownRun is a report, or a recipe that was named, with what it needs.
type knownRun struct {
	name    string // its folder or, of a recipe, its file
	folder  string
	recipe  string // file name of the recipe
	title   string
	outcome string
	ended   time.Time
	gone    bool // there is no run.json any more
	keys    []store.Key
}

// inventory takes stock of a store in a folder. Further reports and recipes are
// named by keep.
func (a *app) inventory(ctx context.Context, s *store.Store, dir string, keep []string) (*inventory, error) {
	inv := &inventory{sizes: map[store.Hash]int64{}, derived: map[store.Hash]bool{}}
	files, flaws, err := s.Runs()
	if err != nil {
		return nil, err
	}
	inv.flaws = flaws
	for _, f := range files {
		err := inv.addRun(f)
		switch {
		case errors.Is(err, fs.ErrNotExist):
			inv.runs = append(inv.runs, knownRun{name: filepath.Dir(f), folder: filepath.Dir(f), gone: true})
		case err != nil:
			inv.flaws = append(inv.flaws, fmt.Errorf("what the report beside %s needs cannot be told: %w; run its recipe again, or delete the file if nobody needs the report", f, err))
		}
	}
	for _, k := range keep {
		if err := a.keepNamed(ctx, inv, dir, k); err != nil {
			return nil, err
		}
	}
	return inv, inv.addRecords(s)
}

// addRun adds a report by its run.json.
func (inv *inventory) addRun(file string) error {
	r, err := record.Read(file)
	if err != nil {
		return err
	}
	for _, known := range inv.runs {
		if known.folder == filepath.Dir(file) {
			return nil
		}
	}
	inv.runs = append(inv.runs, knownRun{name: filepath.Dir(file), folder: filepath.Dir(file), recipe: r.Recipe.Name, title: r.Title, outcome: r.Outcome, ended: r.Ended, keys: r.Keys()})
	for _, h := range r.Hashes() {
		inv.derived[h] = true
	}
	return nil
}

// keepNamed adds a report or a recipe that the user names.
func (a *app) keepNamed(ctx context.Context, inv *inventory, dir, name string) error {
	st, err := os.Stat(name)
	switch {
	case err != nil:
		return fmt.Errorf("--keep %s: %w", name, err)
	case st.IsDir():
		name = filepath.Join(name, recordFile)
	case filepath.Ext(name) != ".json":
		return a.keepRecipe(ctx, inv, dir, name)
	}
	if name, err = filepath.Abs(name); err != nil {
		return err
	}
	return inv.addRun(name)
}

// keepRecipe adds a recipe with its own settings, and what a run of it would
// look up in the store. What comes after a result that is not known has no key
// yet, so none that could be kept.
func (a *app) keepRecipe(ctx context.Context, inv *inventory, dir, file string) error {
	o := defaults()
	o.store = dir
	p, code, err := prepare(ctx, file, o)
	if err != nil {
		return fmt.Errorf("--keep %s: %w", file, err)
	}
	e, _, err := a.newEngine(p, code, o)
	if err != nil {
		return err
	}
	e.Forecast()
	run := knownRun{name: file, folder: file, recipe: filepath.Base(file), title: p.Recipe.Title}
	add := func(c engine.Computation) {
		if c.Text != "" {
			run.keys = append(run.keys, c.Text.Key())
		}
		for _, v := range c.Results {
			inv.derived[v.Hash] = true
		}
	}
	looked := e.Looked()
	for _, in := range looked.Inputs {
		add(in.Computation)
	}
	for _, s := range looked.Steps {
		add(s.Computation)
		for _, el := range s.Elements {
			add(el)
		}
	}
	inv.runs = append(inv.runs, run)
	return nil
}

// addRecords adds all records of the store.
func (inv *inventory) addRecords(s *store.Store) error {
	needed := map[store.Key][]int{}
	for i, r := range inv.runs {
		for _, k := range r.keys {
			if list := needed[k]; len(list) == 0 || list[len(list)-1] != i {
				needed[k] = append(list, i)
			}
		}
	}
	keys, err := s.Keys()
	if err != nil {
		return err
	}
	all, errs := make([]holding, len(keys)), make([]error, len(keys))
	parallel(len(keys), func(i int) {
		if e, ok, _ := s.Entry(keys[i]); ok {
			all[i] = holding{Entry: e, needed: needed[keys[i]]}
			all[i].objects, errs[i] = engine.Live(s, e.Record)
		}
	})
	if err := errors.Join(errs...); err != nil {
		return err
	}
	for _, h := range all {
		if h.Record.Key == (store.Key{}) {
			continue // flawed, which verifying tells
		}
		for _, o := range h.objects {
			if n, ok := s.Size(o); ok {
				inv.sizes[o] = n
			}
		}
		h.Size = inv.size(h)
		inv.held = append(inv.held, h)
	}
	sort.SliceStable(inv.held, func(i, j int) bool { return inv.held[i].Written.Before(inv.held[j].Written) })
	return nil
}

// size is how many bytes the objects of holdings take, each object once.
func (inv *inventory) size(held ...holding) int64 {
	seen, sum := map[store.Hash]bool{}, int64(0)
	for _, h := range held {
		for _, o := range h.objects {
			if !seen[o] {
				seen[o] = true
				sum += inv.sizes[o]
			}
		}
	}
	return sum
}

// total is how many bytes the objects that records lead to take.
func (inv *inventory) total() int64 {
	sum := int64(0)
	for _, n := range inv.sizes {
		sum += n
	}
	return sum
}

// who lists the reports and recipes that need a holding.
func (inv *inventory) who(runs []int) []string {
	var out []string
	for _, i := range runs {
		out = append(out, shortPath(inv.runs[i].name))
	}
	sort.Strings(out)
	return out
}

// title is what a key's text is about: the step, or the layout that is read.
func title(text string) string {
	for _, line := range strings.SplitN(text, "\n", 3) {
		if name, ok := strings.CutPrefix(line, "step "); ok {
			return name
		}
		if strings.HasPrefix(line, "read ") {
			return line
		}
	}
	return "?"
}
