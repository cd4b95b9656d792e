package job

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"sync/atomic"

	"pinfill/internal/encode"
	"pinfill/internal/extend"
	"pinfill/internal/fault"
	"pinfill/internal/parallel"
	"pinfill/internal/table"
)

// ExtendOptions are the options of extend.
type ExtendOptions struct {
	*Options
	ModelFile string
	Recheck   int                    // rows to solve again; 0 means none
	Given     func(flag string) bool // whether a flag stands on the command line
}

// Extend labels the rows of a new table from a saved run, batch by batch, in input order and constant memory.
func Extend(ctx context.Context, e *ExtendOptions) error {
	r, ctx, cancel := start(ctx, e.Options)
	defer cancel()
	overModel := table.Outputs{Stdout: r.Stdout, Inputs: []string{e.ModelFile}}
	if err := overModel.Check(r.Output, r.Timings); err != nil {
		return err
	}
	w, err := r.openOutputs()
	if err != nil {
		return err
	}
	defer w.abort()
	x, err := r.loadExtension(ctx, e)
	if err != nil {
		return err
	}
	s, err := table.OpenStream(ctx, r.Table, r.Stdin, r.streamOptions())
	if err != nil {
		return err
	}
	defer s.Close()
	if err := x.findColumns(s.Head()); err != nil {
		return err
	}
	err = r.stage(ctx, "extend", func() error { return x.stream(ctx, s, w.byRole["table"]) })
	if err != nil {
		return err
	}
	if x.rows == 0 {
		return fault.Inputf("C17", "%s: 0 data rows", fault.Name(r.Table))
	}
	x.report()
	if x.stray != nil {
		if err := r.stage(ctx, "recheck", func() error { return x.recheck(ctx) }); err != nil {
			return err
		}
	}
	return r.finish(w, &Record{})
}

// extension is an extend under way.
type extension struct {
	*run
	model *extend.Extender
	judge *rowJudge
	cols  []int // feature columns of the new table, in the model's order
	rows  int
	stray *recheck
	given map[int]givenLabel // labels that stand in the table, by row; nil in extend

	counts    [5]int // rows by origin
	byClass   []int  // rows by class, of those that are not empty
	low, high float64
}

// givenLabel is a label that stands in the table.
type givenLabel struct {
	text  []byte
	class int32
	value float64
}

func (r *run) loadExtension(ctx context.Context, e *ExtendOptions) (*extension, error) {
	x := &extension{run: r}
	return x, r.stage(ctx, "model", func() error {
		m, err := readModel(e.ModelFile)
		if err != nil {
			return err
		}
		if x.model, err = extend.NewExtender(ctx, m, r.Workers); err != nil {
			return err
		}
		if x.judge, err = newRowJudge(x.model, e); err != nil {
			return &fault.Error{Exit: fault.Input, File: e.ModelFile, Message: err.Error(), Err: err}
		}
		if e.Recheck > 0 && !canRecheck(m) {
			return fault.Usagef("P09", "--recheck needs a model with labels held exactly and nearest neighbours, not --tether or --radius")
		}
		if e.Recheck > 0 {
			x.stray = newRecheck(e.Recheck, r.Seed)
		}
		return nil
	})
}

// findColumns finds the model's features in the new table by name.
func (x *extension) findColumns(head *table.Table) error {
	for _, name := range x.model.Features {
		c, err := column(head, name, "features")
		if err != nil {
			return &fault.Error{Exit: fault.Input, Code: "L04", File: x.Table, Message: fmt.Sprintf("has no column %s, a feature of the model", fault.Quote(name)), Hint: nearHint(head, name)}
		}
		x.cols = append(x.cols, c)
	}
	return refuseAdded(x.Table, head)
}

func nearHint(head *table.Table, name string) string {
	if near, ok := encode.Nearest(name, head.Headers()); ok {
		return "did you mean " + fault.Quote(near) + "?"
	}
	return ""
}

// stream labels batch after batch.
func (x *extension) stream(ctx context.Context, s *table.Stream, out io.Writer) error {
	for {
		batch, err := s.Next()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		res, err := x.batch(ctx, batch)
		if err != nil {
			return err
		}
		if err := table.WriteAppended(out, batch, x.columnsOf(res)); err != nil {
			return err
		}
		x.rows += batch.Rows()
		x.count(res)
	}
}

func (x *extension) columnsOf(res *encode.Result) []table.Column {
	cols := res.Columns(x.Scores)
	if x.SpreadsheetSafe {
		for i := range cols {
			cols[i].Cell = spreadsheetSafe(cols[i].Cell)
		}
	}
	return cols
}

// count adds a batch to the figures of the result.
func (x *extension) count(res *encode.Result) {
	if x.byClass == nil {
		x.byClass, x.low, x.high = make([]int, len(res.Names)), math.Inf(1), math.Inf(-1)
	}
	for row, o := range res.Origin {
		x.counts[o]++
		switch {
		case o == encode.Abstained || o == encode.OriginBlank:
		case res.Task == encode.Classes:
			x.byClass[res.Class[row]]++
		default:
			x.low, x.high = min(x.low, res.Value[row]), max(x.high, res.Value[row])
		}
	}
}

// figures are the result's figures for the record; the median would take all values at once and is left out.
func (x *extension) figures() ResultFigures {
	f := ResultFigures{
		Given: x.counts[encode.Given], Inferred: x.counts[encode.Inferred], Bridged: x.counts[encode.Bridged],
		Abstained: x.counts[encode.Abstained], Blank: x.counts[encode.OriginBlank],
	}
	for c, n := range x.byClass {
		f.Classes = append(f.Classes, ClassCount{x.model.Classes[c], n})
	}
	if len(x.byClass) == 0 && x.low <= x.high {
		lo, hi := Number(x.low), Number(x.high)
		f.Low, f.High = &lo, &hi
	}
	return f
}

// batch labels the rows of one batch on all workers.
func (x *extension) batch(ctx context.Context, t *table.Table) (*encode.Result, error) {
	nums, err := t.Numbers(ctx, x.cols, table.NumberOptions{Decimal: x.Decimal, Workers: x.Workers})
	if err != nil {
		return nil, err
	}
	rows, classes := t.Rows(), len(x.model.Scores)
	res := x.judge.newResult(x.model.Model, rows, x.Scores)
	var failed atomic.Int64 // first row that could not be labelled, plus 1
	const grain = 512
	parallel.For(x.Workers, rows, grain, func(lo, hi int) {
		work := x.model.NewWork()
		scores, prob := make([]float64, classes), make([]float64, classes)
		for row := lo; row < hi; row++ {
			features := nums.Data[row*len(x.cols) : (row+1)*len(x.cols)]
			if missing := x.fill(features); missing {
				x.judge.blank(res, row)
				if x.model.Missing == string(encode.MissingStop) {
					first(&failed, row)
				}
				continue
			}
			at, err := x.model.Row(features, scores, work)
			if err != nil {
				x.judge.blank(res, row)
				first(&failed, row)
				continue
			}
			x.judge.row(res, row, scores, at, prob)
		}
	})
	if f := failed.Load(); f > 0 {
		return nil, x.rowFault(t, int(f-1), nums)
	}
	if x.given != nil {
		x.standing(res)
	}
	if x.stray != nil {
		x.stray.take(nums, res)
	}
	return res, nil
}

// standing puts the labels that stand in the table in their rows.
func (x *extension) standing(res *encode.Result) {
	start := x.rows
	res.GivenText = func(row int) []byte { return x.given[start+row].text }
	nan := math.NaN()
	for row := range res.Origin {
		g, there := x.given[start+row]
		if !there {
			continue
		}
		res.Origin[row] = encode.Given
		if res.Task == encode.Classes {
			res.Class[row] = g.class
			if res.Confidence != nil {
				res.Confidence[row], res.Set[row] = nan, nil
			}
			continue
		}
		res.Value[row] = g.value
		if res.Low != nil {
			res.Low[row], res.High[row] = nan, nan
		}
	}
}

// fill puts the model's medians for missing features and reports whether one is still missing.
func (x *extension) fill(features []float64) bool {
	missing := false
	for j, v := range features {
		if !math.IsNaN(v) {
			continue
		}
		if x.model.Median == nil {
			missing = true
			continue
		}
		features[j] = x.model.Median[j]
	}
	return missing
}

// first keeps the smallest row.
func first(at *atomic.Int64, row int) {
	for {
		old := at.Load()
		if old != 0 && old <= int64(row+1) || at.CompareAndSwap(old, int64(row+1)) {
			return
		}
	}
}

func (x *extension) rowFault(t *table.Table, row int, nums *table.Numbers) error {
	for j := range x.cols {
		if math.IsNaN(nums.Data[row*len(x.cols)+j]) {
			return t.Fault(row, x.cols[j], "G08", "missing feature", "the model was saved with --missing=stop; save it with --missing=median or --missing=drop")
		}
	}
	e := t.Fault(row, x.cols[0], "G09", "the row is too far from the model's to be scaled", "leave the row out")
	e.Name, e.Value = "", ""
	return e
}

// report says what came out.
func (x *extension) report() {
	x.note("%s: %d new rows labelled from %d vertices at p=%s", x.Table, x.rows, x.model.Rows, x.model.PText)
	if n := x.counts[encode.Abstained]; n > 0 {
		x.note("%d rows left empty as too doubtful", n)
	}
	if n := x.counts[encode.OriginBlank]; n > 0 {
		x.note("%d rows blank", n)
	}
	x.warnNovel()
}

// expectedNovel is the share of rows that lie farther from the model's than 99 of 100 of these lie from each other,
// where new rows are like the model's; twice as many are worth a word.
const expectedNovel = 0.01

// warnNovel says when more rows than chance allows are unlike those that were solved.
func (x *extension) warnNovel() {
	n := int(x.judge.novel.Load())
	if share := float64(n) / float64(x.rows); share > 2*expectedNovel {
		x.warnf("", "%d rows (%.1f%%) lie farther from the solved rows than 99%% of these lie from each other; their labels rest on little", n, 100*share)
	}
}
