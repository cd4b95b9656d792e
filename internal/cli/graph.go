package cli

import (
	"github.com/spf13/cobra"

	"pinfill/internal/fault"
	"pinfill/internal/job"
)

func (a *app) graphCommand() *cobra.Command {
	o, v := a.defaults(), newVerbosity()
	format := job.FormatEdges
	cmd := &cobra.Command{
		Use:   "graph TABLE -o EDGES",
		Short: "write the neighbour graph as an edge list or Matrix Market",
		Long: `Writes the neighbour graph of TABLE with its weights: an edge list (from,to,weight), or a symmetric Matrix Market file
with --format mtx. Identical rows are one vertex, named by the first of their ids in order. With --label the label
column is kept out of the features.`,
		Example: `  pinfill graph demo/seabed.csv --label bottom --id cell -o edges.csv
  pinfill graph demo/clips.csv --label state --id clip --neighbors 15 --bandwidth local -o edges.csv
  pinfill graph demo/seabed.csv --label bottom --id cell --format mtx -o seabed.mtx`,
		Args: exactArgs("TABLE"),
	}
	f := a.newFlags(cmd)
	inputFlags(f, o)
	graphFlags(f, o)
	f.under("Output")
	outputFlag(f, o)
	oneOf(f, &format, "format", "edges for an edge list, mtx for Matrix Market", job.FormatEdges, job.FormatMatrixMarket)
	a.runFlags(f, o, v)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		o.Table = args[0]
		if o.Output == "" {
			return fault.Usagef("P09", "graph needs -o FILE, or -o - for standard output")
		}
		if err := single(o); err != nil {
			return err
		}
		return v.around(a, o, func() error { return job.Graph(cmd.Context(), o, format) })
	}
	return cmd
}
