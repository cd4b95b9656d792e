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
		Long: `Labels the rows of NEWTABLE from a run saved with label --model, without solving again: each new row takes the value that
minimises its own part of the energy. NEWTABLE is streamed in constant memory, so it may be larger than memory; - reads
standard input. Columns are found by name; others are passed through.`,
		Example: `  pinfill extend seabed.model new_cells.csv -o new_done.csv
  zcat new_cells.csv.gz | pinfill extend seabed.model - -o - | gzip > new_done.csv.gz
  pinfill extend seabed.model new_cells.csv --recheck 200 -o new_done.csv`,
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
