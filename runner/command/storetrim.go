package command

import (
	"errors"
	"fmt"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"rimlight/runner/store"
)

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
further ones are named with --keep, and so are recipes whose results are to stay
although no report has been written since. Results that are needed stay, whatever
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
			if remove {
				release, err := s.Alone()
				if err != nil {
					return err
				}
				defer release()
			}
			inv, err := a.inventory(c.Context(), s, args[0], keep)
			if err != nil {
				return err
			}
			for _, f := range inv.flaws {
				fmt.Fprintln(a.stderr, "rimlight:", f)
			}
			if remove && len(inv.flaws) > 0 {
				return &exit{status: ExitFailed, cause: errors.New("nothing was taken out, since it could be what a report needs")}
			}
			return a.trim(s, inv, age, int64(most), remove)
		},
	}
	c.Flags().StringVar(&older, "older", "", "only what was written longer ago than `AGE`, such as 30d or 12h")
	c.Flags().Var(&most, "size", "only as much, oldest first, as brings the store down to `SIZE`, such as 2GB")
	c.Flags().StringArrayVar(&keep, "keep", nil, "also keep what the report in `FOLDER` needs, or what a recipe does (name the folder, its run.json, or the recipe)")
	c.Flags().BoolVar(&remove, "remove", false, "take them out; without it they are only shown")
	return c
}

func (a *app) trim(s *store.Store, inv *inventory, age time.Duration, most int64, remove bool) error {
	now := time.Now()
	left := inv.total()
	keep := inv.derived
	count := 0
	for _, r := range inv.runs {
		if r.gone {
			fmt.Fprintf(a.stdout, "the report in %s is gone, and needs nothing\n", shortPath(r.folder))
		}
	}
	for _, h := range inv.held {
		stays := len(h.needed) > 0 || age > 0 && now.Sub(h.Written) < age || most > 0 && left <= most
		if stays {
			for _, o := range h.objects {
				keep[o] = true
			}
			continue
		}
		count++
		left -= h.Size
		fmt.Fprintf(a.stdout, "%-34s %s  %10s  %s\n", title(h.Record.Text), h.Record.Key.Short(), bytesText(h.Size), h.Written.Format("2006-01-02 15:04"))
		if remove {
			if err := s.Remove(h.Record.Key); err != nil {
				return err
			}
		}
	}
	files, size, err := s.Sweep(keep, now.Add(-time.Hour), !remove)
	if err != nil {
		return err
	}
	verb := "would be taken out; give --remove to do it"
	if remove {
		verb = "taken out"
	}
	fmt.Fprintf(a.stdout, "%d results and %d files of %s %s\n", count, files, bytesText(size), verb)
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
