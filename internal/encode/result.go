package encode

import (
	"strconv"
	"strings"

	"pinfill/internal/table"
)

// Origin says where a row's label comes from.
type Origin uint8

// Origins of a label, as the column pinfill_origin writes them.
const (
	Inferred    Origin = iota // by the solver
	Given                     // by the expert
	Bridged                   // by the solver, through an edge added to a component without a label
	Abstained                 // left empty: too doubtful
	OriginBlank               // left empty: out of reach of any label, or a missing feature
)

var originNames = [...]string{Inferred: "inferred", Given: "given", Bridged: "bridged", Abstained: "abstained", OriginBlank: "blank"}

// String is the word written in the column.
func (o Origin) String() string { return originNames[o] }

// Result is what label found for every table row.
type Result struct {
	Task       Task
	Names      []string // class names
	Origin     []Origin
	Class      []int32              // index into Names, or -1; classes only
	Value      []float64            // numbers only
	Confidence []float64            // classes only; nil means the columns stay empty, NaN an empty cell
	Set        [][]int32            // classes only; conformal set a row, most likely first; nil row means empty
	Low, High  []float64            // numbers only; nil means empty columns; infinite ends are written -inf and inf
	Scores     [][]float64          // with --scores: one slice of rows a class
	GivenText  func(row int) []byte // the given label's own bytes
}

// Columns gives the columns that label appends, in the contract's order.
func (r *Result) Columns(scores bool) []table.Column {
	cols := []table.Column{
		{Name: "pinfill_label", Cell: r.label},
		{Name: "pinfill_origin", Cell: func(row int, dst []byte) []byte { return append(dst, r.Origin[row].String()...) }},
		{Name: "pinfill_confidence", Cell: func(row int, dst []byte) []byte { return number(dst, r.Confidence, row) }},
	}
	if r.Task == Classes {
		cols = append(cols, table.Column{Name: "pinfill_set", Cell: r.set})
	} else {
		cols = append(cols,
			table.Column{Name: "pinfill_low", Cell: func(row int, dst []byte) []byte { return number(dst, r.Low, row) }},
			table.Column{Name: "pinfill_high", Cell: func(row int, dst []byte) []byte { return number(dst, r.High, row) }})
	}
	if scores {
		for c, score := range r.Scores {
			name := "pinfill_score"
			if r.Task == Classes {
				name += "_" + r.Names[c]
			}
			cols = append(cols, table.Column{Name: name, Cell: func(row int, dst []byte) []byte { return number(dst, score, row) }})
		}
	}
	return cols
}

func (r *Result) label(row int, dst []byte) []byte {
	switch r.Origin[row] {
	case Given:
		return append(dst, r.GivenText(row)...)
	case Abstained, OriginBlank:
		return dst
	}
	if r.Task == Classes {
		return append(dst, r.Names[r.Class[row]]...)
	}
	return number(dst, r.Value, row)
}

func (r *Result) set(row int, dst []byte) []byte {
	if r.Set == nil {
		return dst
	}
	for k, c := range r.Set[row] {
		if k > 0 {
			dst = append(dst, '|')
		}
		dst = append(dst, EscapeSetName(r.Names[c])...)
	}
	return dst
}

// EscapeSetName puts a backslash before | and \ so that a set can be split again.
func EscapeSetName(name string) string {
	return setEscapes.Replace(name)
}

var setEscapes = strings.NewReplacer(`\`, `\\`, `|`, `\|`)

// SplitSet undoes the joining of a set.
func SplitSet(set string) []string {
	if set == "" {
		return nil
	}
	var names []string
	var b strings.Builder
	for i := 0; i < len(set); i++ {
		switch {
		case set[i] == '\\' && i+1 < len(set):
			i++
			b.WriteByte(set[i])
		case set[i] == '|':
			names = append(names, b.String())
			b.Reset()
		default:
			b.WriteByte(set[i])
		}
	}
	return append(names, b.String())
}

// number appends the shortest decimal that reads back to the same float64; NaN is an empty cell.
func number(dst []byte, values []float64, row int) []byte {
	if values == nil || values[row] != values[row] {
		return dst
	}
	return AppendNumber(dst, values[row])
}

// AppendNumber writes v as the shortest decimal that reads back to the same float64, without an exponent where that
// is readable; infinities are written inf and -inf.
func AppendNumber(dst []byte, v float64) []byte {
	if v > maxFloat || v < -maxFloat {
		if v < 0 {
			return append(dst, "-inf"...)
		}
		return append(dst, "inf"...)
	}
	a := max(v, -v)
	if v == 0 {
		return append(dst, '0') // -0 too: the sign of zero means nothing in a table
	}
	if a < 1e-5 || a >= 1e21 {
		return strconv.AppendFloat(dst, v, 'e', -1, 64)
	}
	return strconv.AppendFloat(dst, v, 'f', -1, 64)
}

const maxFloat = 0x1p1023 * (1 + (1 - 0x1p-52))
