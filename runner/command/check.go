package command

import (
	"fmt"
	"strings"

	"github.com/spf13/cobra"
)

func (a *app) checkCommand() *cobra.Command {
	var o options
	c := &cobra.Command{
		Use:   "check RECIPE",
		Short: "Parse, wire and type-check a recipe; show what would be run and why; run nothing",
		Long: `Check says everything that is wrong with a recipe, or, when nothing is, shows
its steps, what each takes from where, and whether its result is known or would
be computed, and why.` + exitHelp,
		Args: cobra.ExactArgs(1),
		RunE: func(c *cobra.Command, args []string) error {
			go a.library()
			p, code, err := prepare(c.Context(), args[0], &o)
			if err != nil {
				return a.wrong(err, &o)
			}
			e, _, err := a.newEngine(p, code, &o)
			if err != nil {
				return err
			}
			forecast := e.Forecast()
			for i, f := range forecast {
				if o.json {
					writeJSON(a.stdout, map[string]any{"event": "plan", "name": f.Name, "input": f.Input, "known": f.Known, "total": f.Total, "why": f.Why})
					continue
				}
				if o.quiet {
					continue
				}
				if i > 0 && !f.Input && forecast[i-1].Input {
					fmt.Fprintln(a.stdout)
				}
				what := "would be computed: " + f.Why
				switch {
				case f.Known == f.Total:
					what = "known"
				case f.Known > 0:
					what = fmt.Sprintf("%d of %d known; %s", f.Known, f.Total, f.Why)
				case f.Waits != "":
					what = "waits for " + f.Waits
				}
				fmt.Fprintf(a.stdout, "%-18s %s\n", f.Name, what)
				if !f.Input {
					fmt.Fprintf(a.stdout, "%-18s   takes %s\n", "", strings.Join(f.Takes, ", "))
				}
			}
			if o.why != "" {
				return a.showWhy(o.why, e, e.Looked())
			}
			return nil
		},
	}
	o.flags(c)
	c.Flags().StringVar(&o.why, "why", "", "show the key of `STEP`, and what changed in it (STEP:N for element N)")
	return c
}
