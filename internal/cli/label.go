package cli

import (
	"github.com/spf13/cobra"

	"pinfill/internal/fault"
	"pinfill/internal/job"
)

func (a *app) labelCommand() *cobra.Command {
	o, v := a.defaults(), newVerbosity()
	var repeat string
	cmd := &cobra.Command{
		Use:   "label TABLE --label COL -o OUT",
		Short: "label every row",
		Long: `Labels every row of TABLE from the rows that carry a label, and says of each how far to trust it. The output holds
the input's own bytes with columns added: pinfill_label, pinfill_origin, pinfill_confidence and so on. Nothing is
written unless every solve is certified. The table is held in memory, about 1 kB a row at ten neighbours.`,
		Example: `  pinfill label demo/seabed.csv --label bottom --id cell -o seabed_done.csv
  pinfill label demo/grain.csv --label grain_phi --id cell --p 4 --record grain.json -o grain_done.csv
  pinfill label demo/clips.csv --label state --id clip --scores --report clips.html -o clips_done.csv`,
		Args: exactArgs("TABLE"),
	}
	f := a.newFlags(cmd)
	inputFlags(f, o)
	graphFlags(f, o)
	modelFlags(f, o)
	trustFlags(f, o)
	f.under("Output")
	outputFlag(f, o)
	f.bool(&o.Scores, "scores", "add one column a class with the solution of its problem, unclamped")
	f.text(&o.Record, "record", "", "FILE.json", "write the run record: settings, hashes, certificates, warnings")
	f.text(&o.Report, "report", "", "FILE.html", "write the report, one file that opens offline")
	f.text(&o.Model, "model", "", "FILE", "save the run, so that pinfill extend can label new rows")
	f.text(&o.Deps, "deps", "", "FILE", "write a make dependency file for the output")
	f.bool(&o.InPlace, "in-place", "let the output replace the input table")
	f.bool(&o.SpreadsheetSafe, "spreadsheet-safe", "put ' before added cells that a spreadsheet would run as a formula")
	f.bool(&o.AcceptUncertified, "accept-uncertified", "write the result although a solve missed its tolerance; the record says so")
	f.count(&o.SolveOn, "solve-on", "N", "all rows", "solve on the labelled rows and N spread-out others, extend to the rest", "P08", 1)
	f.text(&repeat, "repeat", "", "RECORD.json", "repeat a recorded run and say whether the bytes agree")
	a.runFlags(f, o, v)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		o.Table = args[0]
		if repeat != "" {
			return a.repeat(cmd, f, o, v, repeat)
		}
		if err := a.ready(f, o, v); err != nil {
			return err
		}
		if err := single(o); err != nil {
			return err
		}
		if o.Output == "" {
			return fault.Usagef("P09", "label needs -o FILE, or -o - for standard output")
		}
		return v.around(a, o, func() error { return job.Label(cmd.Context(), o) })
	}
	return cmd
}

// repeat runs a recorded job again: flags of the record that are not on the command line are set from it.
func (a *app) repeat(cmd *cobra.Command, f *flags, o *job.Options, v *verbosity, path string) error {
	rec, err := job.ReadRecord(path)
	if err != nil {
		return err
	}
	for _, name := range rec.FlagNames() {
		if !f.given(name) && f.all[name] != nil {
			if err := cmd.Flags().Set(name, rec.Flags[name]); err != nil {
				return fault.Usagef("P09", "%s: flag --%s: %v", fault.Name(path), name, err)
			}
		}
	}
	if err := a.ready(f, o, v); err != nil {
		return err
	}
	if err := single(o); err != nil {
		return err
	}
	return v.around(a, o, func() error { return job.Repeat(cmd.Context(), o, rec, path) })
}

// outputFlag is -o, which every command that writes a table has.
func outputFlag(f *flags, o *job.Options) {
	f.text(&o.Output, "output", "o", "FILE|-", "where the result goes; - is standard output")
}

// single refuses lists where a command takes one setting.
func single(o *job.Options) error {
	for _, l := range []struct {
		flag string
		n    int
	}{{"p", len(o.P)}, {"neighbors", len(o.Neighbors)}, {"kernel", len(o.Kernels)}, {"bandwidth", len(o.Bandwidths)}} {
		if l.n > 1 {
			return fault.Usagef("P09", "flag --%s takes one value here; pinfill compare takes a list", l.flag)
		}
	}
	return nil
}

// ready checks what can only be checked when all flags are known.
func (a *app) ready(f *flags, o *job.Options, v *verbosity) error {
	switch {
	case o.Label == "":
		return fault.Usagef("L04", "--label COL is required: which column holds the labels?")
	case v.quiet && v.verbose:
		return fault.Usagef("P09", "--quiet and --verbose exclude each other")
	case f.given("neighbors") && f.given("radius"):
		return fault.Usagef("P09", "--neighbors and --radius exclude each other")
	case f.given("abstain") && f.given("abstain-rate"):
		return fault.Usagef("P09", "--abstain and --abstain-rate exclude each other")
	case o.LabelsFile != "" && o.ID == "":
		return fault.Usagef("P09", "--labels needs --id to join on")
	case o.Edges != "" && o.ID == "":
		return fault.Usagef("P09", "--edges needs --id: the column that from and to refer to")
	case o.Edges != "" && (f.given("neighbors") || f.given("radius") || f.given("bandwidth") || f.given("kernel") || f.given("features")):
		return fault.Usagef("P09", "--edges brings its own graph: --neighbors, --radius, --bandwidth, --kernel and --features do not apply")
	case o.Table == "-" && isTerminal(a.in):
		return fault.Usagef("S18", "standard input is a terminal; name a file or pipe a table in")
	}
	o.Flags = f.typed(notRecorded)
	return nil
}

// notRecorded are the flags that say where things go or how the machine is used; they do not change the answer.
var notRecorded = map[string]bool{
	"output": true, "record": true, "report": true, "model": true, "timings": true, "deps": true, "workers": true, "quiet": true,
	"verbose": true, "progress": true, "time-limit": true, "memory-limit": true, "in-place": true, "repeat": true,
}
