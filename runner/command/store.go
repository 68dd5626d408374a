package command

import (
	"fmt"
	"os"
	"time"

	"github.com/schollz/progressbar/v3"
	"github.com/spf13/cobra"

	"rimlight/runner/store"
)

func (a *app) storeCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "store",
		Short: "List, show, verify or trim what a result store holds",
		Long: `A result store keeps what was computed, by what it was computed from. It may be
deleted as a whole at any time; what is needed will be computed again.` + exitHelp,
	}
	c.AddCommand(a.storeListCommand(), a.storeShowCommand(), a.storeVerifyCommand(), a.storeTrimCommand())
	return c
}

// openStore opens a store that is there already.
func openStore(dir string) (*store.Store, error) {
	if st, err := os.Stat(dir); err != nil || !st.IsDir() {
		return nil, fmt.Errorf("there is no result store %s", dir)
	}
	return store.Open(dir)
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
