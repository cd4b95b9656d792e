package job

import (
	"bytes"
	"compress/gzip"
	"context"
	"encoding/base64"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"strconv"

	"pinfill/internal/choose"
	"pinfill/internal/fault"
	"pinfill/internal/solve"
	"pinfill/internal/table"
)

// compareHead are the columns of a comparison before those of the agreement with each setting.
var compareHead = []string{
	"setting", "p", "neighbors", "kernel", "bandwidth", "balance", "left_out_error", "std_error", "log_loss", "labels_left_out", "label_drop", "bulk_range",
	"energy_share_at_labels", "smallest_class_share", "largest_class_share", "gap", "imbalance", "width", "slope_imbalance", "linear_solves", "iterations",
	"certified", "advised",
}

// writeComparison writes the whole comparison.
func (r *run) writeComparison(out io.Writer, sweep *compared) error {
	w := table.NewWriter(out, ',')
	head := append([]string{}, compareHead...)
	for i := range sweep.settings {
		head = append(head, "agreement_"+strconv.Itoa(i+1))
	}
	if err := w.Row(head...); err != nil {
		return err
	}
	agreement := choose.Agreement(sweep.answers, sweep.labels)
	best := sweep.advised(sweep.labels.Task)
	for i := range sweep.settings {
		cells := append(sweep.cells(i), yes(i == best))
		for _, a := range agreement[i] {
			cells = append(cells, numberText(a))
		}
		if err := w.Row(cells...); err != nil {
			return err
		}
	}
	return w.Flush()
}

func yes(b bool) string {
	if b {
		return "yes"
	}
	return "no"
}

// cells are the row of one setting up to the advice.
func (sweep *compared) cells(i int) []string {
	s := sweep.scores[i]
	k, kernel, band := strconv.Itoa(s.Neighbors), s.Kernel.String(), bandwidthText(s.Bandwidth)
	if sweep.given {
		k, kernel, band = "", "", ""
	}
	low, high := math.NaN(), math.NaN()
	balance := ""
	if s.Shares != nil {
		balance = balanceName(s.Balance)
		low, high = s.Shares[0], s.Shares[0]
		for _, v := range s.Shares {
			low, high = min(low, v), max(high, v)
		}
	}
	return []string{
		strconv.Itoa(i + 1), PText(s.P), k, kernel, band, balance, numberText(s.Error), numberText(s.StdError), numberText(s.LogLoss), strconv.Itoa(s.LeftOut),
		numberText(s.Spike), numberText(s.Bulk), numberText(s.Kappa), numberText(low), numberText(high),
		numberText(s.Certificate.Gap), numberText(s.Certificate.Imbalance), numberText(s.Certificate.Width), numberText(s.Certificate.SlopeImbalance),
		strconv.Itoa(s.Count.LinearSolves), strconv.Itoa(s.Count.Iterations), yes(s.Certified),
	}
}

// partRow is a setting's score as a part of a sweep hands it on.
type partRow struct {
	Setting     int       `json:"setting"` // from 0
	P           Number    `json:"p"`
	Error       Number    `json:"error"`
	StdError    Number    `json:"std_error"`
	LogLoss     Number    `json:"log_loss"`
	LeftOut     int       `json:"left_out"`
	Spike       Number    `json:"spike"`
	Bulk        Number    `json:"bulk"`
	Kappa       Number    `json:"kappa"`
	Shares      []Number  `json:"shares"`
	Certificate [4]Number `json:"certificate"` // gap, imbalance, width, slope imbalance
	Certified   bool      `json:"certified"`
	Count       [2]int    `json:"count"` // linear solves, iterations
	Loss        []Number  `json:"loss"`
	Class       []int32   `json:"class"`
	Value       []Number  `json:"value"`
}

// writePart writes the settings of one part: a table for the eye, with all that --join needs in the last column, a gzip
// of JSON in base64.
func (r *run) writePart(out io.Writer, sweep *compared, c *CompareOptions) error {
	w := table.NewWriter(out, ',')
	if err := w.Row("part", "setting", "p", "left_out_error", "state"); err != nil {
		return err
	}
	for i, s := range sweep.scores {
		if s == nil {
			continue
		}
		row := partRow{
			Setting: i, P: Number(s.P), Error: Number(s.Error), StdError: Number(s.StdError), LogLoss: Number(s.LogLoss), LeftOut: s.LeftOut,
			Spike: Number(s.Spike), Bulk: Number(s.Bulk), Kappa: Number(s.Kappa), Shares: numbers(s.Shares),
			Certificate: [4]Number{Number(s.Certificate.Gap), Number(s.Certificate.Imbalance), Number(s.Certificate.Width), Number(s.Certificate.SlopeImbalance)},
			Certified:   s.Certified, Count: [2]int{s.Count.LinearSolves, s.Count.Iterations}, Loss: numbers(s.Loss),
			Class: sweep.answers[i].Class, Value: numbers(sweep.answers[i].Value),
		}
		state, err := pack(row)
		if err != nil {
			return err
		}
		if err := w.Row(fmt.Sprintf("%d/%d", c.Part, c.Parts), strconv.Itoa(i+1), PText(s.P), numberText(s.Error), state); err != nil {
			return err
		}
	}
	return w.Flush()
}

func pack(row partRow) (string, error) {
	b, err := json.Marshal(row)
	if err != nil {
		return "", err
	}
	var z bytes.Buffer
	g := gzip.NewWriter(&z)
	if _, err := g.Write(b); err != nil {
		return "", err
	}
	if err := g.Close(); err != nil {
		return "", err
	}
	return base64.StdEncoding.EncodeToString(z.Bytes()), nil
}

func unpack(state string) (row partRow, err error) {
	z, err := base64.StdEncoding.DecodeString(state)
	if err != nil {
		return row, err
	}
	g, err := gzip.NewReader(bytes.NewReader(z))
	if err != nil {
		return row, err
	}
	b, err := io.ReadAll(g)
	if err != nil {
		return row, err
	}
	return row, json.Unmarshal(b, &row)
}

// joinParts reads the outputs of all parts of this very sweep.
func (r *run) joinParts(ctx context.Context, sweep *compared, files []string) error {
	sweep.scores = make([]*choose.Score, len(sweep.settings))
	sweep.answers = make([]choose.Answers, len(sweep.settings))
	const longest = 1 << 30 // a state holds an answer a row
	for _, name := range files {
		t, err := table.Read(ctx, name, r.Stdin, table.Options{MaxField: longest, Workers: r.Workers})
		if err != nil {
			return err
		}
		c, err := column(t, "state", "join")
		if err != nil {
			return err
		}
		for row := range t.Rows() {
			p, err := unpack(t.Text(row, c))
			if err != nil || p.Setting < 0 || p.Setting >= len(sweep.settings) || float64(p.P) != sweep.settings[p.Setting].P || len(p.Loss) != sweep.labels.Count() && len(p.Loss) > 0 {
				e := t.Fault(row, c, "", "not a part of this sweep", "give the same table and flags as the parts were run with")
				e.Value = ""
				return e
			}
			if sweep.scores[p.Setting] != nil {
				e := t.Fault(row, c, "", fmt.Sprintf("setting %d stands in an earlier part too", p.Setting+1), "name each part once")
				e.Value = ""
				return e
			}
			sweep.scores[p.Setting] = p.score(sweep.settings[p.Setting])
			sweep.answers[p.Setting] = choose.Answers{Class: p.Class}
			if p.Value != nil && p.Class == nil {
				sweep.answers[p.Setting].Value = floats(p.Value)
			}
		}
	}
	for i, s := range sweep.scores {
		if s == nil {
			return fault.Inputf("", "--join: setting %d (p=%s) is in none of the parts", i+1, PText(sweep.settings[i].P))
		}
	}
	return nil
}

func (p partRow) score(s choose.Setting) *choose.Score {
	out := &choose.Score{
		Setting: s, Error: float64(p.Error), StdError: float64(p.StdError), LogLoss: float64(p.LogLoss), LeftOut: p.LeftOut,
		Degeneracy: choose.Degeneracy{Spike: float64(p.Spike), Bulk: float64(p.Bulk), Kappa: float64(p.Kappa)},
		Certified:  p.Certified, Count: solve.Counts{LinearSolves: p.Count[0], Iterations: p.Count[1]},
		Certificate: solve.Certificate{Gap: float64(p.Certificate[0]), Imbalance: float64(p.Certificate[1]), Width: float64(p.Certificate[2]), SlopeImbalance: float64(p.Certificate[3])},
	}
	if len(p.Loss) > 0 {
		out.Loss = floats(p.Loss)
	}
	if len(p.Shares) > 0 {
		out.Shares = floats(p.Shares)
	}
	return out
}
