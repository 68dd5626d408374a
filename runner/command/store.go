package command

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"sort"
	"strconv"
	"strings"
	"time"

	"github.com/schollz/progressbar/v3"
	"github.com/spf13/cobra"

	"rimlight/runner/engine"
	"rimlight/runner/record"
	"rimlight/runner/store"
)

func (a *app) storeCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "store",
		Short: "List, verify or trim a result store",
		Long: `A result store keeps what was computed, by what it was computed from. It may be
deleted as a whole at any time; what is needed will be computed again.` + exitHelp,
	}
	c.AddCommand(a.storeListCommand(), a.storeVerifyCommand(), a.storeTrimCommand())
	return c
}

// openStore opens a store that is there already.
func openStore(dir string) (*store.Store, error) {
	if st, err := os.Stat(dir); err != nil || !st.IsDir() {
		return nil, fmt.Errorf("there is no result store %s", dir)
	}
	return store.Open(dir)
}

// A holding is a record in a store, and who needs it.
type holding struct {
	store.Entry
	needed []string // reports, by their folders
}

// holdings lists what a store holds, oldest first. The flaws are why it may not
// be known who needs it.
func holdings(s *store.Store, more []string) (out []holding, flaws []error, err error) {
	runs, flaws, err := s.Runs()
	if err != nil {
		return nil, nil, err
	}
	for _, m := range more {
		if st, err := os.Stat(m); err == nil && st.IsDir() {
			m = filepath.Join(m, recordFile)
		}
		if _, err := record.Read(m); err != nil {
			return nil, nil, err
		}
		runs = append(runs, m)
	}
	needed := map[store.Key][]string{}
	for _, run := range runs {
		r, err := record.Read(run)
		if errors.Is(err, fs.ErrNotExist) {
			continue // the report is gone, and needs nothing
		}
		if err != nil {
			flaws = append(flaws, fmt.Errorf("what the report beside %s needs cannot be told: %w; run its recipe again, or delete the file if nobody needs the report", run, err))
			continue
		}
		for _, k := range r.Keys() {
			if list := needed[k]; len(list) == 0 || list[len(list)-1] != filepath.Dir(run) {
				needed[k] = append(list, filepath.Dir(run))
			}
		}
	}
	keys, err := s.Keys()
	if err != nil {
		return nil, nil, err
	}
	for _, k := range keys {
		e, ok, _ := s.Entry(k)
		if ok {
			out = append(out, holding{e, needed[k]})
		}
	}
	sort.SliceStable(out, func(i, j int) bool { return out[i].Written.Before(out[j].Written) })
	return out, flaws, nil
}

func (a *app) storeListCommand() *cobra.Command {
	var each bool
	c := &cobra.Command{
		Use:   "list DIR",
		Short: "Show what a store holds, how large and how old it is, and which reports need it",
		Args:  cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			s, err := openStore(args[0])
			if err != nil {
				return err
			}
			list, flaws, err := holdings(s, nil)
			if err != nil {
				return err
			}
			for _, f := range flaws {
				fmt.Fprintln(a.stderr, "note:", f)
			}
			type group struct {
				name   string
				count  int
				size   int64
				newest time.Time
				inUse  int
				needed map[string]bool
			}
			groups := map[string]*group{}
			var order []string
			for _, h := range list {
				name := title(h.Record.Text)
				if each {
					name += "  " + h.Record.Key.String()[:12]
				}
				g := groups[name]
				if g == nil {
					g = &group{name: name, needed: map[string]bool{}}
					groups[name] = g
					order = append(order, name)
				}
				g.count++
				g.size += h.Size
				g.newest = h.Written
				if len(h.needed) > 0 {
					g.inUse++
				}
				for _, n := range h.needed {
					g.needed[n] = true
				}
			}
			fmt.Fprintf(a.stdout, "%-34s %8s %10s  %-16s  %s\n", "what", "results", "size", "newest", "needed by")
			for _, name := range order {
				g := groups[name]
				var folders []string
				for n := range g.needed {
					folders = append(folders, shortPath(n))
				}
				sort.Strings(folders)
				who := strings.Join(folders, ", ")
				switch {
				case g.inUse == 0:
					who = "no report"
				case g.inUse < g.count:
					who += fmt.Sprintf(" (%d of %d)", g.inUse, g.count)
				}
				fmt.Fprintf(a.stdout, "%-34s %8d %10s  %-16s  %s\n", g.name, g.count, bytesText(g.size), g.newest.Format("2006-01-02 15:04"), who)
			}
			return nil
		},
	}
	c.Flags().BoolVar(&each, "each", false, "one line for each result")
	return c
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

func bytesText(n int64) string {
	switch {
	case n >= 1e9:
		return fmt.Sprintf("%.2f GB", float64(n)/1e9)
	case n >= 1e6:
		return fmt.Sprintf("%.2f MB", float64(n)/1e6)
	case n >= 1e3:
		return fmt.Sprintf("%.2f kB", float64(n)/1e3)
	}
	return fmt.Sprintf("%d B", n)
}

func (a *app) storeVerifyCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "verify DIR",
		Short: "Read everything in a store and compare it with its hash",
		Long: `Verify reads and hashes everything. It changes nothing: what is damaged will be
set aside and computed again by the run that needs it. The exit status is 1 when
something is damaged.`,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			s, err := openStore(args[0])
			if err != nil {
				return err
			}
			var bar *progressbar.ProgressBar
			hints, errs, err := s.Verify(func(done, total int) {
				if !a.terminal {
					return
				}
				if bar == nil {
					bar = progressbar.NewOptions(total, progressbar.OptionSetWriter(a.stderr), progressbar.OptionClearOnFinish(), progressbar.OptionThrottle(100*time.Millisecond))
				}
				bar.Set(done)
			})
			if err != nil {
				return err
			}
			for _, h := range hints {
				fmt.Fprintln(a.stdout, "hint:", h)
			}
			for _, e := range errs {
				fmt.Fprintln(a.stdout, "damaged:", e)
			}
			fmt.Fprintf(a.stdout, "%d damaged, %d hints\n", len(errs), len(hints))
			if len(errs) > 0 {
				return &exit{status: ExitFailed}
			}
			return nil
		},
	}
}

func (a *app) storeTrimCommand() *cobra.Command {
	var older string
	var most size
	var keep []string
	var remove bool
	c := &cobra.Command{
		Use:   "trim DIR",
		Short: "Take results out of a store that no report needs",
		Long: `Trim shows which results no report needs, and takes them out with --remove. A
report is known to the store as long as its run.json is where the run wrote it;
further ones are named with --keep. Results that a report needs stay, whatever
their age and size. While a run uses the store, nothing is taken out of it.`,
		Example: "  rimlight store trim rimlight.store --older 30d\n  rimlight store trim rimlight.store --size 2GB --remove",
		Args:    cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			s, err := openStore(args[0])
			if err != nil {
				return err
			}
			age, err := parseAge(older)
			if err != nil {
				return err
			}
			return a.trim(s, keep, age, int64(most), remove)
		},
	}
	c.Flags().StringVar(&older, "older", "", "only what was written longer ago than `AGE`, such as 30d or 12h")
	c.Flags().Var(&most, "size", "only as much, oldest first, as brings the store down to `SIZE`, such as 2GB")
	c.Flags().StringArrayVar(&keep, "keep", nil, "also keep what the run in `FOLDER` needs (or name its run.json)")
	c.Flags().BoolVar(&remove, "remove", false, "take them out; without it they are only shown")
	return c
}

func (a *app) trim(s *store.Store, keep []string, age time.Duration, most int64, remove bool) error {
	if remove {
		release, err := s.Alone()
		if err != nil {
			return err
		}
		defer release()
	}
	list, flaws, err := holdings(s, keep)
	if err != nil {
		return err
	}
	for _, f := range flaws {
		fmt.Fprintln(a.stderr, "rimlight:", f)
	}
	if remove && len(flaws) > 0 {
		return &exit{status: ExitFailed, cause: errors.New("nothing was taken out, since it could be what a report needs")}
	}
	now := time.Now()
	total := int64(0)
	for _, h := range list {
		total += h.Size
	}
	live := map[store.Hash]bool{}
	var going []holding
	freed := int64(0)
	for _, h := range list {
		stays := len(h.needed) > 0 || age > 0 && now.Sub(h.Written) < age || most > 0 && total-freed <= most
		if !stays {
			going = append(going, h)
			freed += h.Size
			continue
		}
		objects, err := engine.Live(s, h.Record)
		if err != nil {
			return err
		}
		for _, o := range objects {
			live[o] = true
		}
	}
	for _, h := range going {
		fmt.Fprintf(a.stdout, "%-34s %s  %10s  %s\n", title(h.Record.Text), h.Record.Key.String()[:12], bytesText(h.Size), h.Written.Format("2006-01-02 15:04"))
		if remove {
			if err := s.Remove(h.Record.Key); err != nil {
				return err
			}
		}
	}
	files, size, err := s.Sweep(live, now.Add(-time.Hour), !remove)
	if err != nil {
		return err
	}
	verb := "would be taken out; give --remove to do it"
	if remove {
		verb = "taken out"
	}
	fmt.Fprintf(a.stdout, "%d results and %d files of %s %s\n", len(going), files, bytesText(size), verb)
	return nil
}

// parseAge reads a duration, which may be in days: 30d.
func parseAge(s string) (time.Duration, error) {
	if s == "" {
		return 0, nil
	}
	if days, ok := strings.CutSuffix(s, "d"); ok {
		n, err := strconv.ParseFloat(days, 64)
		if err == nil && n >= 0 && n < 1e5 {
			return time.Duration(n * 24 * float64(time.Hour)), nil
		}
	} else if d, err := time.ParseDuration(s); err == nil && d >= 0 {
		return d, nil
	}
	return 0, fmt.Errorf("%q is not an age; expected a number with a unit, such as 30d or 12h", s)
}
