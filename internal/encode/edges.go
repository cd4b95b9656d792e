package encode

import (
	"fmt"

	"pinfill/internal/fault"
	"pinfill/internal/graph"
	"pinfill/internal/table"
)

// ReadEdges reads an edge table with the columns from, to and weight; vertexOf maps an id to its vertex. Edge k is row
// k of the table.
func ReadEdges(t *table.Table, vertexOf map[string]int32, decimal byte) ([]graph.Edge, error) {
	var cols [3]int
	for i, name := range []string{"from", "to", "weight"} {
		c, ok := t.ColumnIndex(name)
		if !ok {
			return nil, NoColumn(t, name, "edges")
		}
		cols[i] = c
	}
	edges := make([]graph.Edge, 0, t.Rows())
	var refused fault.List
	for row := range t.Rows() {
		var end [2]int32
		known := true
		for i := range end {
			v, ok := vertexOf[t.Text(row, cols[i])]
			if !ok {
				refused.Add(t.Fault(row, cols[i], "L12", "no row of the table has this id", "check the ids, or name the id column with --id"))
				known = false
			}
			end[i] = v
		}
		w, err := table.ParseNumber(trimCell(t.Cell(row, cols[2])), decimal)
		switch {
		case err != nil:
			if e := t.NumberFault(row, cols[2], decimal); e != nil {
				refused.Add(e)
			}
		case !(w > 0):
			refused.Add(t.Fault(row, cols[2], "P07", "an edge weight must be greater than 0", "leave the edge out"))
		case known:
			edges = append(edges, graph.Edge{I: end[0], J: end[1], W: w})
		}
	}
	return edges, refused.Err()
}

// PairFault refuses two rows that give one pair of vertices different weights.
func PairFault(t *table.Table, first, second int) *fault.Error {
	c, _ := t.ColumnIndex("weight")
	line, _ := t.At(first, c)
	return t.Fault(second, c, "L11", fmt.Sprintf("the same pair has another weight on line %d", line), "give each pair one weight")
}
