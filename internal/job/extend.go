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
	w, err := r.openOutputs()
	if err != nil {
		return err
	}
	defer w.abort()
	x, err := r.loadExtension(ctx, e)
	if err != nil {
		return err
	}
	s, err := table.OpenStream(ctx, r.Table, r.Stdin, table.Options{
		Delimiter: r.Delimiter, Decimal: r.Decimal, NA: r.NA, NoHeader: r.NoHeader,
		MaxField: r.MaxField, MaxColumns: r.MaxColumns, Workers: r.Workers,
	})
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
		if err := r.stage(ctx, "recheck", func() error { return x.stray.solve(ctx, x) }); err != nil {
			return err
		}
	}
	return r.finish(w, &Record{})
}

// extension is an extend under way.
type extension struct {
	*run
	model  *extend.Extender
	judge  *rowJudge
	cols   []int // feature columns of the new table, in the model's order
	labels int   // label column of the new table, or -1
	rows   int
	counts [5]int // rows by origin
	stray  *recheck
}

func (r *run) loadExtension(ctx context.Context, e *ExtendOptions) (*extension, error) {
	x := &extension{run: r, labels: -1}
	return x, r.stage(ctx, "model", func() error {
		m, err := readModel(e.ModelFile)
		if err != nil {
			return err
		}
		if x.model, err = extend.NewExtender(ctx, m, r.Workers); err != nil {
			return err
		}
		if x.judge, err = newRowJudge(m, e); err != nil {
			return &fault.Error{Exit: fault.Input, File: e.ModelFile, Message: err.Error(), Err: err}
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
	for _, c := range []string{"pinfill_label", "pinfill_origin"} {
		if _, there := head.ColumnIndex(c); there {
			return &fault.Error{Exit: fault.Input, Code: "C14", File: x.Table, Name: c, Message: "the table already has this column", Hint: "remove the columns of an earlier run first"}
		}
	}
	return nil
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
		for _, o := range res.Origin {
			x.counts[o]++
		}
	}
}

func (x *extension) columnsOf(res *encode.Result) []table.Column {
	return res.Columns(x.Scores)
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
		scores := make([]float64, classes)
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
			x.judge.row(res, row, scores, at)
		}
	})
	if f := failed.Load(); f > 0 {
		return nil, x.rowFault(t, int(f-1), nums)
	}
	if x.stray != nil {
		x.stray.take(x.rows, nums, res)
	}
	return res, nil
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
	if x.judge.novel.Load() > 0 {
		x.warnf("", "%d rows lie farther from the model's rows than 99%% of these lie from each other; their labels rest on little", x.judge.novel.Load())
	}
}
