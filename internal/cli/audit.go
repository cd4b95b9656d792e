package cli

import (
	"github.com/spf13/cobra"

	"pinfill/internal/fault"
	"pinfill/internal/job"
)

func (a *app) auditCommand() *cobra.Command {
	o, v := a.defaults(), newVerbosity()
	cmd := &cobra.Command{
		Use:   "audit TABLE --label COL -o OUT",
		Short: "list given labels that their neighbourhood disputes",
		Long: `Writes the given labels, most suspicious first: each with the label the rest of the data would give it, how strongly,
corrected for the number of labels looked at, and the rows that say so. Nothing in TABLE is changed.`,
		Example: `  pinfill audit demo/seabed.csv --label bottom --id cell -o disputed.csv
  pinfill audit demo/grain.csv --label grain_phi --id cell -o disputed.csv
  pinfill audit demo/clips.csv --label state --id clip --p 4 -o -`,
		Args: exactArgs("TABLE"),
	}
	f := a.newFlags(cmd)
	inputFlags(f, o)
	graphFlags(f, o)
	modelFlags(f, o)
	f.under("Output")
	outputFlag(f, o)
	f.text(&o.Record, "record", "", "FILE.json", "write the run record")
	f.bool(&o.AcceptUncertified, "accept-uncertified", "write the result although a solve missed its tolerance")
	a.runFlags(f, o, v)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		o.Table = args[0]
		if err := a.ready(f, o, v); err != nil {
			return err
		}
		if err := single(o); err != nil {
			return err
		}
		if o.Output == "" {
			return fault.Usagef("P09", "audit needs -o FILE, or -o - for standard output")
		}
		return v.around(a, o, func() error { return job.Audit(cmd.Context(), o) })
	}
	return cmd
}
