package cli

import (
	"github.com/spf13/cobra"

	"pinfill/internal/fault"
	"pinfill/internal/job"
)

func (a *app) assessCommand() *cobra.Command {
	s := job.AssessOptions{Options: a.defaults()}
	o, v := s.Options, newVerbosity()
	cmd := &cobra.Command{
		Use:   "assess DONE --truth COL",
		Short: "assess a completed table against checked rows",
		Long: `Compares the labels of a completed table with checked rows: confusion matrix, user's, producer's and overall accuracy,
kappa, and with --strata the stratified estimators with standard errors; RMSE, MAE and interval coverage for numbers.
Rows whose label was given are left out of the figures. The truth stands in DONE, or in a second table (--labels).`,
		Example: `  pinfill assess seabed_done.csv --truth bottom_truth --labels demo/seabed_truth.csv --id cell
  pinfill assess grain_done.csv --truth grain_phi_truth --labels demo/grain_truth.csv --id cell
  pinfill assess clips_done.csv --truth state_truth --labels demo/clips_truth.csv --id clip --json`,
		Args: exactArgs("DONE"),
	}
	f := a.newFlags(cmd)
	f.under("Table")
	f.text(&s.Truth, "truth", "", "COL", "column with the checked label; an empty cell is a row that was not checked")
	f.text(&s.Strata, "strata", "", "COL", "column of the strata the checked rows were drawn from")
	f.text(&o.LabelsFile, "labels", "", "FILE", "second table that holds the truth, joined on the id")
	f.text(&o.ID, "id", "", "COL", "column with a name for each row")
	oneOf(f, &o.Task, "task", "what the labels are; by the completed table when not given", "classes", "numbers")
	dialectFlags(f, o)
	f.under("Output")
	f.bool(&s.JSON, "json", "write JSON for scripts")
	f.text(&o.Output, "output", "o", "FILE|-", "where the assessment goes (default standard output)")
	a.runFlags(f, o, v)
	cmd.RunE = func(cmd *cobra.Command, args []string) error {
		o.Table = args[0]
		switch {
		case s.Truth == "":
			return fault.Usagef("L04", "--truth COL is required: which column holds the checked labels?")
		case o.LabelsFile != "" && o.ID == "":
			return fault.Usagef("P09", "--labels needs --id to join on")
		}
		return v.around(a, o, func() error {
			text, err := job.Assess(cmd.Context(), &s)
			if err != nil || o.Output != "" {
				return err
			}
			return a.print(text)
		})
	}
	return cmd
}
