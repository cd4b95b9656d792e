package cli

import (
	"fmt"

	"github.com/spf13/cobra"

	"pinfill/internal/fault"
	"pinfill/internal/job"
)

func (a *app) compareCommand() *cobra.Command {
	o, v := a.defaults(), newVerbosity()
	var part string
	var join []string
	cmd := &cobra.Command{
		Use:   "compare TABLE --label COL --p 2,3,4,inf -o OUT",
		Short: "compare settings on one table by leaving labels out",
		Long: `Writes one row for each combination of --p, --bandwidth, --neighbors and --kernel: leave-one-out error with its noise,
log loss or RMSE, degeneracy numbers, class balance, agreement with each other p, certificate and work. The advised row
is marked. A sweep can be split with --part and joined with --join; the joined bytes equal those of one run.`,
		Example: `  pinfill compare demo/seabed.csv --label bottom --id cell --p 2,3,4,inf -o seabed_p.csv
  pinfill compare demo/grain.csv --label grain_phi --id cell --p 2,4,8 --neighbors 7,10,15 -o grain_p.csv
  pinfill compare demo/clips.csv --label state --id clip --p 2,3,5,10,inf --report clips_p.html -o clips_p.csv`,
		Args: exactArgs("TABLE"),
	}
	f := a.newFlags(cmd)
	inputFlags(f, o)
	graphFlags(f, o)
	modelFlags(f, o)
	f.under("Output")
	outputFlag(f, o)
	f.text(&o.Report, "report", "", "FILE.html", "write the comparison as one HTML file")
	f.text(&o.Record, "record", "", "FILE.json", "write the run record")
	f.text(&part, "part", "", "I/N", "run only the I-th of N parts of the sweep")
	f.list(&join, "join", "FILES", "join the outputs of all parts instead of running")
	f.bool(&o.AcceptUncertified, "accept-uncertified", "write the result although a solve missed its tolerance")
	a.runFlags(f, o, v)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		o.Table = args[0]
		if err := a.ready(f, o, v); err != nil {
			return err
		}
		if o.Output == "" {
			return fault.Usagef("P09", "compare needs -o FILE, or -o - for standard output")
		}
		c := job.CompareOptions{Options: o, Join: join, Terminal: isTerminal(a.err) && !v.quiet}
		if part != "" {
			if _, err := fmt.Sscanf(part, "%d/%d", &c.Part, &c.Parts); err != nil || c.Part < 1 || c.Part > c.Parts ||
				part != fmt.Sprintf("%d/%d", c.Part, c.Parts) {
				return fault.Usagef("P09", "flag --part: value %s: I/N with 1 <= I <= N, like 2/8", fault.Quote(part))
			}
			if o.Report != "" {
				return fault.Usagef("P09", "--part has no report of its own: give --report with --join")
			}
			if len(join) > 0 {
				return fault.Usagef("P09", "--part and --join exclude each other")
			}
		}
		return v.around(a, o, func() error { return job.Compare(cmd.Context(), &c) })
	}
	return cmd
}
