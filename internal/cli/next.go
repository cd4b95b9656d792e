package cli

import (
	"github.com/spf13/cobra"

	"pinfill/internal/fault"
	"pinfill/internal/job"
)

func (a *app) nextCommand() *cobra.Command {
	n := job.NextOptions{Options: a.defaults(), Count: 10}
	o, v := n.Options, newVerbosity()
	cmd := &cobra.Command{
		Use:   "next TABLE --label COL --count N -o OUT",
		Short: "name the unlabelled rows worth labelling next",
		Long: `Writes the N unlabelled rows worth labelling next, in order, spread out rather than bunched, each with the expected gain
and the reason in words. Labels chosen this way are no random sample: pass --drawn chosen when you use them.`,
		Example: `  pinfill next demo/seabed.csv --label bottom --id cell --count 12 -o visit.csv
  pinfill next demo/clips.csv --label state --id clip --count 5 -o -
  pinfill next demo/seabed.csv --label bottom --id cell --count 12 --exclude visit.csv -o visit_2.csv`,
		Args: exactArgs("TABLE"),
	}
	f := a.newFlags(cmd)
	f.under("Choice")
	f.count(&n.Count, "count", "N", "10", "rows to name", "P08", 1)
	f.text(&o.Cost, "cost", "", "COL", "column with what labelling each row costs")
	f.text(&n.Exclude, "exclude", "", "FILE", "table of ids that are not to be named")
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
			return fault.Usagef("P09", "next needs -o FILE, or -o - for standard output")
		}
		if n.Exclude != "" && o.ID == "" {
			return fault.Usagef("P09", "--exclude needs --id to join on")
		}
		return v.around(a, o, func() error { return job.Next(cmd.Context(), &n) })
	}
	return cmd
}
