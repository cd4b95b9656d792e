package job

import (
	"cmp"
	"context"
	"errors"
	"io"
	"math"
	"slices"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
	"pinfill/internal/points"
	"pinfill/internal/table"
)

// sample is what the first pass of --solve-on keeps of a table.
type sample struct {
	delimiter byte
	text      []byte      // the drawn rows as a table of their own
	rows      []int       // the table row of each, increasing
	lines     []int       // the table line of each
	starts    []int       // the line of each in text
	heldOut   [][]float64 // features of rows that were drawn and left out, for the check
	bytes     int64       // of the table's file
	sum       [32]byte
}

// line gives the table's line of a line of text.
func (s *sample) line(n int) int {
	at, found := slices.BinarySearch(s.starts, n)
	if !found {
		at--
	}
	if at < 0 {
		return n
	}
	return s.lines[at] + n - s.starts[at]
}

// candidate is a row that may be drawn.
type candidate struct {
	rank     uint64
	row      int
	line     int
	text     []byte
	features []float64
}

// Candidates for each row to solve: the more, the more evenly the drawn ones lie; and held-out rows for the check.
const (
	candidatesEach = 4
	mostHeldOut    = 1000
	fewestHeldOut  = 20
)

// drawSample reads the table once and draws N of its unlabelled rows, spread out as the rows are: the 4N rows whose
// features hash lowest are put in the order of a k-d tree's leaves and cut into N equal stretches, and the middle of
// each is taken. The draw depends on the seed and on the set of distinct rows, never on their order.
func (r *run) drawSample(ctx context.Context) (*sample, error) {
	s, err := table.OpenStream(ctx, r.Table, r.Stdin, r.streamOptions())
	if err != nil {
		return nil, err
	}
	defer s.Close()
	f, err := r.newFirstPass(ctx, s.Head())
	if err != nil {
		return nil, err
	}
	if err := f.read(ctx, s); err != nil {
		return nil, err
	}
	out := &sample{delimiter: s.Head().Delimiter(), bytes: s.Bytes(), sum: s.SHA256()}
	f.tidy()
	chosen, left := f.thin(ctx)
	for _, c := range left[:min(len(left), min(mostHeldOut, max(fewestHeldOut, r.SolveOn/10)))] {
		out.heldOut = append(out.heldOut, c.features)
	}
	chosen = append(chosen, f.labelled...)
	slices.SortFunc(chosen, func(a, b candidate) int { return cmp.Compare(a.row, b.row) })
	for j, name := range s.Head().Headers() {
		if j > 0 {
			out.text = append(out.text, out.delimiter)
		}
		out.text = table.AppendCell(out.text, []byte(name), out.delimiter)
	}
	line := 1 + countLines(out.text)
	out.text = append(out.text, '\n')
	for _, c := range chosen {
		line++
		out.rows, out.lines, out.starts = append(out.rows, c.row), append(out.lines, c.line), append(out.starts, line)
		line += countLines(c.text)
		out.text = append(append(out.text, c.text...), '\n')
	}
	return out, nil
}

func countLines(text []byte) int {
	n := 0
	for _, c := range text {
		if c == '\n' {
			n++
		}
	}
	return n
}

// streamOptions say how a table is streamed.
func (r *run) streamOptions() table.Options {
	return table.Options{
		Delimiter: r.Delimiter, Decimal: r.Decimal, NA: r.NA, NoHeader: r.NoHeader,
		MaxField: r.MaxField, MaxColumns: r.MaxColumns, Workers: r.Workers,
	}
}

// firstPass is the first pass under way.
type firstPass struct {
	*run
	features encode.FeatureOptions
	cols     []int
	label    int // column, or -1 when labels stand in a table of their own
	id       int
	ids      map[string]bool // of labelled rows, when labels stand in a table of their own
	rows     int

	labelled []candidate
	others   []candidate
	below    uint64 // rows of this rank and above are not wanted
}

func (r *run) newFirstPass(ctx context.Context, head *table.Table) (*firstPass, error) {
	f := &firstPass{run: r, label: -1, id: -1, below: math.MaxUint64}
	if err := refuseAdded(r.Table, head); err != nil {
		return nil, err
	}
	var err error
	if r.ID != "" {
		if f.id, err = column(head, r.ID, "id"); err != nil {
			return nil, err
		}
	}
	if r.LabelsFile == "" {
		if f.label, err = column(head, r.Label, "label"); err != nil {
			return nil, err
		}
	} else if err := f.readIDs(ctx); err != nil {
		return nil, err
	}
	f.features = encode.FeatureOptions{
		Reserved: r.reserved(&data{table: head}), Features: r.Features, Ignore: r.Ignore, Missing: r.Missing, Decimal: r.Decimal, Workers: r.Workers,
	}
	named, _, err := encode.ReadFeatures(ctx, head, f.features) // without rows: which columns there are by name
	if err != nil {
		return nil, err
	}
	f.cols = named.Columns
	return f, nil
}

// readIDs notes which ids are labelled.
func (f *firstPass) readIDs(ctx context.Context) error {
	t, err := f.readTable(ctx, "labels", f.LabelsFile, &data{})
	if err != nil {
		return err
	}
	c, err := column(t, f.ID, "id")
	if err != nil {
		return err
	}
	f.ids = map[string]bool{}
	for row := range t.Rows() {
		f.ids[t.Text(row, c)] = true
	}
	return nil
}

func (f *firstPass) isLabelled(t *table.Table, row int) bool {
	if f.ids != nil {
		return f.ids[t.Text(row, f.id)]
	}
	return !t.Missing(row, f.label)
}

// read takes every batch.
func (f *firstPass) read(ctx context.Context, s *table.Stream) error {
	for {
		t, err := s.Next()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		nums, err := t.Numbers(ctx, f.cols, table.NumberOptions{Decimal: f.Decimal, Workers: f.Workers})
		if err != nil || nums.Missing > 0 && f.Missing == encode.MissingStop {
			// The refusal that label gives: a text column, or the missing cells.
			if _, _, refused := encode.ReadFeatures(ctx, t, f.features); refused != nil {
				return refused
			}
			if err != nil {
				return err
			}
		}
		f.take(t, nums)
		f.rows += t.Rows()
	}
}

// take offers the rows of a batch.
func (f *firstPass) take(t *table.Table, nums *table.Numbers) {
	most := 2 * candidatesEach * f.SolveOn
	for row := range t.Rows() {
		features := nums.Data[row*nums.Cols : (row+1)*nums.Cols]
		if f.isLabelled(t, row) {
			f.labelled = append(f.labelled, f.candidate(t, row, 0, nil))
			continue
		}
		rank, whole := rankOf(f.Seed, features)
		if !whole || rank >= f.below {
			continue
		}
		f.others = append(f.others, f.candidate(t, row, rank, slices.Clone(features)))
		if len(f.others) >= most {
			f.tidy()
		}
	}
}

func (f *firstPass) candidate(t *table.Table, row int, rank uint64, features []float64) candidate {
	c := candidate{rank: rank, row: f.rows + row, features: features}
	c.line, _ = t.At(row, 0)
	for j := range t.Columns() {
		if j > 0 {
			c.text = append(c.text, t.Delimiter())
		}
		c.text = table.AppendCell(c.text, t.Cell(row, j), t.Delimiter())
	}
	return c
}

// tidy keeps the candidates of lowest rank, one of each set of equal rows.
func (f *firstPass) tidy() {
	slices.SortFunc(f.others, func(a, b candidate) int {
		return cmp.Or(cmp.Compare(a.rank, b.rank), cmp.Compare(a.row, b.row))
	})
	f.others = slices.CompactFunc(f.others, func(a, b candidate) bool { return a.rank == b.rank })
	if most := candidatesEach * f.SolveOn; len(f.others) > most {
		f.below = f.others[most].rank
		clear(f.others[most:])
		f.others = f.others[:most]
	}
}

// thin draws N of the candidates, the middle one of each of N stretches, and gives the others by rank.
func (f *firstPass) thin(ctx context.Context) (chosen, left []candidate) {
	if len(f.others) <= f.SolveOn {
		return f.others, nil
	}
	m := points.NewMatrix(len(f.others), len(f.cols))
	for i, c := range f.others {
		copy(m.Row(i), c.features)
	}
	space, err := points.Prepare(ctx, m, points.Options{Scale: f.Scale, Metric: f.Metric, Workers: f.Workers})
	if err != nil { // it is refused, with its place, when the drawn rows are labelled
		return f.others[:f.SolveOn], f.others[f.SolveOn:]
	}
	taken := make([]bool, space.Points.N)
	n := min(f.SolveOn, space.Points.N)
	for i := range n {
		taken[(2*i+1)*space.Points.N/(2*n)] = true
	}
	seen := make([]bool, space.Points.N)
	for i, c := range f.others {
		v := space.Vertex[i]
		switch {
		case seen[v]:
		case taken[v]:
			chosen = append(chosen, c)
		default:
			left = append(left, c)
		}
		seen[v] = true
	}
	return chosen, left
}

// mix is a bijection that scatters (splitmix64, Steele, Lea and Flood 2014).
func mix(x uint64) uint64 {
	x += 0x9e3779b97f4a7c15
	x = (x ^ x>>30) * 0xbf58476d1ce4e5b9
	x = (x ^ x>>27) * 0x94d049bb133111eb
	return x ^ x>>31
}

// rankOf is a row's place in a seeded draw, from its features alone, and whether it has them all.
func rankOf(seed uint64, features []float64) (rank uint64, whole bool) {
	rank = mix(seed)
	for _, v := range features {
		if math.IsNaN(v) {
			return 0, false
		}
		rank = mix(rank ^ math.Float64bits(v+0)) // -0 is 0
	}
	return rank, true
}

// refuseAdded refuses a table that already has columns of an earlier run.
func refuseAdded(name string, head *table.Table) error {
	for _, c := range []string{"label", "origin", "confidence", "set", "low", "high"} {
		if _, there := head.ColumnIndex("pinfill_" + c); there {
			return &fault.Error{Exit: fault.Input, Code: "C14", File: name, Name: "pinfill_" + c, Message: "the table already has this column", Hint: "remove the columns of an earlier run first"}
		}
	}
	return nil
}
