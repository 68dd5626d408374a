package command

import (
	"context"
	"fmt"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"rimlight/runner/store"
)

func (a *app) storeListCommand() *cobra.Command {
	var each, json bool
	c := &cobra.Command{
		Use:   "list DIR",
		Short: "Show what a store holds, how large and how old it is, and which recipes and reports need it",
		Long: `List shows the reports that use a store with the size of what they need, of it
what no other report needs, and then what the store holds, step by step.
Results that several steps or reports share count for each of them.` + exitHelp,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			inv, err := a.inventoryOf(c.Context(), args[0])
			if err != nil {
				return err
			}
			for _, f := range inv.flaws {
				fmt.Fprintln(a.stderr, "note:", f)
			}
			if json {
				for _, h := range inv.held {
					writeJSON(a.stdout, inv.facts(h))
				}
				return nil
			}
			a.listRuns(inv)
			a.listSteps(inv, each)
			var needed []holding
			for _, h := range inv.held {
				if len(h.needed) > 0 {
					needed = append(needed, h)
				}
			}
			fmt.Fprintf(a.stdout, "\n%d results, %s; no report needs %d of them, which take %s\n",
				len(inv.held), bytesText(inv.total()), len(inv.held)-len(needed), bytesText(inv.total()-inv.size(needed...)))
			return nil
		},
	}
	c.Flags().BoolVar(&each, "each", false, "one line for each result, with who computed it, when and how long")
	c.Flags().BoolVar(&json, "json", false, "one JSON object for each result, for programs")
	return c
}

// inventoryOf opens a store and says what it holds.
func (a *app) inventoryOf(ctx context.Context, dir string) (*inventory, error) {
	s, err := openStore(dir)
	if err != nil {
		return nil, err
	}
	return a.inventory(ctx, s, dir, nil)
}

// listRuns shows the reports with what they need.
func (a *app) listRuns(inv *inventory) {
	if len(inv.runs) == 0 {
		fmt.Fprint(a.stdout, "no report is known to need anything of this store\n\n")
		return
	}
	fmt.Fprintf(a.stdout, "%-28s %-20s %8s %10s %10s  %-16s  %s\n", "report", "recipe", "results", "size", "its own", "last run", "")
	for i, r := range inv.runs {
		if r.gone {
			fmt.Fprintf(a.stdout, "%-28s is gone, and needs nothing\n", shortPath(r.name))
			continue
		}
		var all, rest []holding
		for _, h := range inv.held {
			if slices.Contains(h.needed, i) {
				all = append(all, h)
			} else if len(h.needed) > 0 {
				rest = append(rest, h)
			}
		}
		both := append(slices.Clone(all), rest...)
		fmt.Fprintf(a.stdout, "%-28s %-20s %8d %10s %10s  %-16s  %s\n", shortPath(r.name), r.recipe, len(all), bytesText(inv.size(all...)),
			bytesText(inv.size(both...)-inv.size(rest...)), minute(r.ended), r.outcome)
	}
	fmt.Fprintln(a.stdout)
}

// listSteps shows what there is, by step, or one by one.
func (a *app) listSteps(inv *inventory, each bool) {
	if each {
		fmt.Fprintf(a.stdout, "%-24s %-12s %10s  %-16s %10s  %-24s  %s\n", "what", "key", "size", "computed", "took", "by", "needed by")
		for _, h := range inv.held {
			r := h.Record
			fmt.Fprintf(a.stdout, "%-24s %-12s %10s  %-16s %10s  %-24s  %s\n", title(r.Text), r.Key.Short(), bytesText(h.Size),
				minute(r.When), r.Took.Round(time.Millisecond), r.Host, neededBy(inv, []holding{h}))
		}
		return
	}
	groups := map[string][]holding{}
	var order []string
	for _, h := range inv.held {
		name := title(h.Record.Text)
		if groups[name] == nil {
			order = append(order, name)
		}
		groups[name] = append(groups[name], h)
	}
	fmt.Fprintf(a.stdout, "%-28s %8s %10s  %-16s  %-16s  %s\n", "what", "results", "size", "oldest", "newest", "needed by")
	for _, name := range order {
		g := groups[name]
		fmt.Fprintf(a.stdout, "%-28s %8d %10s  %-16s  %-16s  %s\n", name, len(g), bytesText(inv.size(g...)), minute(g[0].Written), minute(g[len(g)-1].Written), neededBy(inv, g))
	}
}

// neededBy says which reports need results of one step.
func neededBy(inv *inventory, g []holding) string {
	var runs []int
	inUse := 0
	for _, h := range g {
		if len(h.needed) > 0 {
			inUse++
		}
		runs = append(runs, h.needed...)
	}
	slices.Sort(runs)
	who := strings.Join(inv.who(slices.Compact(runs)), ", ")
	switch {
	case inUse == 0:
		return "no report"
	case inUse < len(g):
		who += fmt.Sprintf(" (%d of %d)", inUse, len(g))
	}
	return who
}

// minute is a time as tables show it, "" for none.
func minute(t time.Time) string {
	if t.IsZero() {
		return ""
	}
	return t.Local().Format("2006-01-02 15:04")
}

// facts are what there is to say of a result, for programs.
func (inv *inventory) facts(h holding) map[string]any {
	r := h.Record
	results := []map[string]any{}
	for _, res := range r.Results {
		results = append(results, map[string]any{"name": res.Name, "type": res.Type, "hash": res.Hash.String(), "size": res.Size})
	}
	return map[string]any{"key": r.Key.String(), "what": title(r.Text), "bytes": h.Size, "written": h.Written.UTC(), "computed": r.When, "seconds": r.Took.Seconds(),
		"by": r.Host, "program": r.Program, "whole": h.Whole, "results": results, "needed_by": append([]string{}, inv.who(h.needed)...)}
}

func (a *app) storeShowCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "show DIR KEY",
		Short: "Show the record of one result: who computed it, when, how long, and on what",
		Long: `Show prints what the store knows of the computation with a key, of which the
first digits are enough: who did it, when, how long it took, its results, what it
said, who needs it, and the text of the key with everything it was computed from.` + exitHelp,
		Example: "  rimlight store show rimlight.store 3f2a9c",
		Args:    cobra.ExactArgs(2),
		RunE: func(c *cobra.Command, args []string) error {
			inv, err := a.inventoryOf(c.Context(), args[0])
			if err != nil {
				return err
			}
			h, err := inv.find(args[1])
			if err != nil {
				return err
			}
			a.showHolding(inv, h)
			return nil
		},
	}
}

// find looks a result up by the beginning of its key.
func (inv *inventory) find(prefix string) (holding, error) {
	var found []holding
	for _, h := range inv.held {
		if strings.HasPrefix(h.Record.Key.String(), strings.ToLower(prefix)) {
			found = append(found, h)
		}
	}
	switch len(found) {
	case 1:
		return found[0], nil
	case 0:
		return holding{}, fmt.Errorf("the store has no result whose key begins with %q; rimlight store list --each shows them", prefix)
	}
	return holding{}, fmt.Errorf("%d keys begin with %q: give more of it", len(found), prefix)
}

func (a *app) showHolding(inv *inventory, h holding) {
	r := h.Record
	line := func(what, text string) {
		if text != "" {
			fmt.Fprintf(a.stdout, "%-10s %s\n", what, text)
		}
	}
	line("what", title(r.Text))
	line("key", r.Key.String())
	line("by", r.Host)
	line("program", r.Program)
	line("computed", r.When.Format(time.RFC3339))
	line("took", r.Took.String())
	line("needed by", neededBy(inv, []holding{h}))
	for _, res := range r.Results {
		state := ""
		if !h.Whole {
			state = absent(inv, res.Hash)
		}
		line("result", fmt.Sprintf("%s %s, %s, %s%s", res.Name, res.Type, bytesText(res.Size), res.Hash, state))
	}
	for _, n := range r.Notes {
		line("note", n)
	}
	if r.Log != "" {
		fmt.Fprintf(a.stdout, "\nit said\n  %s\n", strings.ReplaceAll(strings.TrimSuffix(r.Log, "\n"), "\n", "\n  "))
	}
	fmt.Fprintf(a.stdout, "\ncomputed from\n  %s\n", strings.ReplaceAll(strings.TrimSuffix(r.Text, "\n"), "\n", "\n  "))
}

func absent(inv *inventory, h store.Hash) string {
	if _, ok := inv.sizes[h]; ok {
		return ""
	}
	return ", which is missing"
}
