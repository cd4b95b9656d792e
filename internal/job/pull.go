package job

import (
	"context"
	"math"

	"gonum.org/v1/gonum/mat"

	"pinfill/internal/choose"
	"pinfill/internal/encode"
	"pinfill/internal/laplace"
	"pinfill/internal/sparse"
)

// solved runs the stages that audit and next share with label: everything up to the chosen solution and its evidence.
func (r *run) solved(ctx context.Context, command string) (*labelled, error) {
	d, err := r.load(ctx)
	if err != nil {
		return nil, err
	}
	l := &labelled{data: d, record: r.newRecord(command, d)}
	if l.network, err = r.findNetwork(ctx, d); err != nil {
		return nil, err
	}
	if err := r.placeLabels(d, l.network.vertices); err != nil {
		return nil, err
	}
	if err := r.stage(ctx, "solve", func() error { return r.chooseSetting(ctx, l) }); err != nil {
		return nil, err
	}
	err = r.stage(ctx, "trust", func() error { return r.judge(ctx, l) })
	return l, err
}

// reached gives the part of the field's graph that labels reach, with its conductances, and the labels on it.
func (r *run) reached(f *field) (sparse.Part, *sparse.CSR, []int32) {
	keep := make([]bool, f.graph.N)
	labels := make([]bool, f.graph.N)
	for _, v := range f.labels.Vertex {
		labels[v] = true
	}
	component, _ := sparse.Components(f.graph)
	has := map[int32]bool{}
	for _, v := range f.labels.Vertex {
		has[component[v]] = true
	}
	for v := range keep {
		keep[v] = has[component[v]]
	}
	part := sparse.Induce(f.graph, keep)
	var fixed []int32
	for v, x := range part.Vertices {
		if labels[x] {
			fixed = append(fixed, int32(v))
		}
	}
	return part, choose.Conductances(part.Graph, r.Energy), fixed
}

// schurTolerance is the residual of the solves behind the Schur complement: doubts and voices need three digits.
const schurTolerance = 1e-8

// schur gives the Schur complement of the Laplacian (p = 2) on the labels.
func (r *run) schur(ctx context.Context, f *field) (*mat.SymDense, error) {
	_, conductance, fixed := r.reached(f)
	system, err := laplace.New(ctx, conductance, fixed, laplace.Options{Workers: r.Workers})
	if err != nil {
		return nil, err
	}
	s, _, err := system.Harmonic(ctx, schurTolerance, nil)
	return s, err
}

// rowName is how a row is called: by its id, or by its number from 1.
func (d *data) rowName(row int) string {
	if d.id >= 0 {
		return d.table.Text(row, d.id)
	}
	return string(encode.AppendNumber(nil, float64(row+1)))
}

// numberText writes a figure for a table: four significant digits, empty when it does not apply.
func numberText(v float64) string {
	if math.IsNaN(v) {
		return ""
	}
	return figureText(v)
}
