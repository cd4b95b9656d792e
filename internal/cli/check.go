package cli

import (
	"github.com/spf13/cobra"

	"pinfill/internal/job"
)

func (a *app) checkCommand() *cobra.Command {
	o, v := a.defaults(), newVerbosity()
	var asJSON bool
	cmd := &cobra.Command{
		Use:   "check TABLE --label COL",
		Short: "report on a table and the graph it would give, changing nothing",
		Long: `Reads TABLE and reports, changing nothing: rows, columns, labels and classes; missing, constant, duplicated and
dominating columns; conflicting labels; the neighbour graph it would build; the intrinsic dimension with its spread; the
window of admissible settings for each p; and the p it advises, with the reason.`,
		Example: `  pinfill check demo/seabed.csv --label bottom --id cell
  pinfill check demo/clips.csv --label state --id clip --neighbors 15
  pinfill check demo/grain.csv --label grain_phi --id cell --json`,
		Args: exactArgs("TABLE"),
	}
	f := a.newFlags(cmd)
	inputFlags(f, o)
	graphFlags(f, o)
	modelFlags(f, o)
	f.under("Output")
	f.bool(&asJSON, "json", "write JSON for scripts")
	a.runFlags(f, o, v)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		o.Table = args[0]
		if err := a.ready(f, o, v); err != nil {
			return err
		}
		if err := single(o); err != nil {
			return err
		}
		return v.around(a, o, func() error {
			c, err := job.Check(cmd.Context(), o)
			if err != nil {
				return err
			}
			if asJSON {
				text, err := c.JSON()
				if err != nil {
					return err
				}
				return a.print(text)
			}
			return a.print(c.Text())
		})
	}
	return cmd
}
