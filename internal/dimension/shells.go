package dimension

import (
	"math"

	"pinfill/internal/neighbors"
)

// shells estimates the dimension on rounded coordinates, where whole shells of neighbours are equally far, from the
// growth of the number of neighbours with distance: ln T as a linear function of ln m with slope 1/d, each vertex with
// its own intercept, fitted by least squares over all vertices.
//
// m is the number of neighbours up to a shell, half of the shell counted, plus the vertex's own share of the lattice:
// on a full lattice a ball around a vertex holds the vertex too (of the 5 points within one step in the plane, 3 are
// counted, and the disc's area is 3.14), on sparse continuous data it is there only by choice of the centre and does
// not count. tied, the share of vertices with two equally near neighbours, runs from 0 to 1 between these two. The
// last shell of a list may be cut short and is left out.
func shells(l *neighbors.Lists, tied float64, workers int) Figure {
	count := blocks(l.N)
	xy := make([]float64, count)
	yy := make([]float64, count)
	forBlocks(l.N, workers, func(b, lo, hi int) {
		var x, y []float64 // ln T and ln m of the vertex's shells
		for i := lo; i < hi; i++ {
			dist := l.Dist[i*l.K : (i+1)*l.K]
			x, y = x[:0], y[:0]
			for from := 0; from < l.K; {
				to := from + 1
				for to < l.K && dist[to]-dist[from] <= tieTolerance*dist[to] {
					to++
				}
				if to == l.K {
					break
				}
				x = append(x, math.Log(dist[from]))
				y = append(y, math.Log(tied+float64(float64(from+to)/2)))
				from = to
			}
			mx, my := mean(x), mean(y)
			for t := range x {
				xy[b] += float64((x[t] - mx) * (y[t] - my))
				yy[b] += float64((y[t] - my) * (y[t] - my))
			}
		}
	})
	var sxy, syy float64
	for b := range count {
		sxy += xy[b]
		syy += yy[b]
	}
	without := make([]float64, count)
	for b := range count {
		without[b] = ratio(syy-yy[b], sxy-xy[b])
	}
	return Figure{K: l.K, Value: ratio(syy, sxy), StdError: jackknife(without)}
}

func mean(v []float64) float64 {
	var s float64
	for _, x := range v {
		s += x
	}
	return s / float64(len(v))
}
