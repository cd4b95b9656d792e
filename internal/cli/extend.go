package cli

import (
	"github.com/spf13/cobra"

	"pinfill/internal/fault"
	"pinfill/internal/job"
)

func (a *app) extendCommand() *cobra.Command {
	e := job.ExtendOptions{Options: a.defaults()}
	o, v := e.Options, newVerbosity()
	cmd := &cobra.Command{
		Use:   "extend MODEL NEWTABLE -o OUT",
		Short: "label new rows from a saved run",
		Long: `Labels the rows of NEWTABLE from a run saved with label --model, without solving again: each new row takes the
value that minimises its own part of the energy. NEWTABLE is streamed in constant memory, so it may be larger than
memory; - reads standard input. Columns are found by name; others are passed through.`,
		Example: `  pinfill label demo/seabed.csv --label bottom --id cell --model seabed.model -o seabed_done.csv
  pinfill extend seabed.model demo/grain.csv --id cell -o grain_bottom.csv
  pinfill extend seabed.model demo/grain.csv --recheck 200 -o grain_bottom.csv
  gzip -c demo/grain.csv | pinfill extend seabed.model - -o - | gzip > grain_bottom.csv.gz`,
		Args: exactArgs("MODEL", "NEWTABLE"),
	}
	f := a.newFlags(cmd)
	f.under("Table")
	f.text(&o.ID, "id", "", "COL", "column with a name for each row, for messages")
	dialectFlags(f, o)
	trustFlags(f, o)
	f.under("Output")
	outputFlag(f, o)
	f.bool(&o.Scores, "scores", "add one column a class with its extended solution")
	f.count(&e.Recheck, "recheck", "N", "0", "re-solve with a seeded sample of N new rows and report how far extension strays", "P08", 0)
	a.runFlags(f, o, v)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		e.ModelFile, o.Table = args[0], args[1]
		e.Given = f.given
		if o.Output == "" {
			return fault.Usagef("P09", "extend needs -o FILE, or -o - for standard output")
		}
		if o.Table == "-" && isTerminal(a.in) {
			return fault.Usagef("S18", "standard input is a terminal; name a file or pipe a table in")
		}
		return v.around(a, o, func() error { return job.Extend(cmd.Context(), &e) })
	}
	return cmd
}
