package testproblems

import "math"

// SteepestPaths finds the lexicographic minimiser (p = inf) by its definition: again and again the steepest path
// between held vertices through free ones is found (one search from every held vertex), its vertices are set linearly
// along it, and they are held from then on; what remains is flat. Components without a label stay NaN. It costs about
// labels * n^2 a path.
func SteepestPaths(pr Problem) []float64 {
	f := pr.Hold()
	g := pr.Graph
	top := math.Inf(-1)
	for _, v := range g.Val {
		top = max(top, v)
	}
	length := make([]float64, len(g.Val))
	for k, v := range g.Val {
		length[k] = math.Exp(top - v)
	}
	for {
		best, steep := []int(nil), -1.0
		var bestDist []float64
		for s := range f {
			if math.IsNaN(f[s]) {
				continue
			}
			dist, parent := fromHeld(pr, f, length, s)
			for t := range f {
				// A path of slope 0 is as good as any other once nothing steeper is left: it fills what is flat.
				if math.IsNaN(f[t]) || t == s || math.IsInf(dist[t], 1) || f[s] < f[t] {
					continue
				}
				if slope := (f[s] - f[t]) / dist[t]; slope > steep {
					steep, best, bestDist = slope, nil, nil
					for v := t; v != s; v = parent[v] {
						best, bestDist = append(best, v), append(bestDist, dist[v])
					}
					best = append(best, s)
				}
			}
		}
		if best == nil {
			break
		}
		s := best[len(best)-1]
		for i := 1; i < len(best)-1; i++ {
			f[best[i]] = f[s] - steep*bestDist[i]
		}
	}
	return fillBranches(pr, f)
}

// fromHeld gives distances from s along paths whose inner vertices are free, at least one of them, by the
// quadratic form of Dijkstra's method.
func fromHeld(pr Problem, f, length []float64, s int) (dist []float64, parent []int) {
	g := pr.Graph
	dist, parent = make([]float64, g.N), make([]int, g.N)
	done := make([]bool, g.N)
	for i := range dist {
		dist[i] = math.Inf(1)
	}
	relax := func(v int, d float64) {
		for k := g.RowPtr[v]; k < g.RowPtr[v+1]; k++ {
			u := int(g.Col[k])
			if v == s && !math.IsNaN(f[u]) {
				continue // an edge between held vertices constrains nothing
			}
			if t := d + length[k]; t < dist[u] {
				dist[u], parent[u] = t, v
			}
		}
	}
	done[s] = true
	relax(s, 0)
	for {
		v := -1
		for u := range dist {
			if !done[u] && math.IsNaN(f[u]) && !math.IsInf(dist[u], 1) && (v < 0 || dist[u] < dist[v]) {
				v = u
			}
		}
		if v < 0 {
			return dist, parent
		}
		done[v] = true
		relax(v, dist[v])
	}
}

// fillBranches gives free vertices that hang on a single held one its value.
func fillBranches(pr Problem, f []float64) []float64 {
	for again := true; again; {
		again = false
		for v := range f {
			if !math.IsNaN(f[v]) {
				continue
			}
			cols, _ := pr.Graph.Row(v)
			for _, u := range cols {
				if !math.IsNaN(f[u]) {
					f[v], again = f[u], true
					break
				}
			}
		}
	}
	return f
}
