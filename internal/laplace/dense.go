package laplace

// denseInverse is A^-1 diag(A) of a small matrix, row by row, by the same elimination as factor on a full matrix.
func denseInverse(a *sddm) []float64 {
	n := a.n
	l := make([]float64, n*n) // row k: w_kj, then w_kj / d_k, for j > k
	d := make([]float64, n)
	copy(d, a.excess)
	for i := range n {
		for k := a.ptr[i]; k < a.ptr[i+1]; k++ {
			l[i*n+int(a.col[k])] = a.w[k]
		}
	}
	for k := range n {
		row := l[k*n+k+1 : (k+1)*n]
		e := d[k]
		for _, w := range row {
			d[k] += w
		}
		for m, w := range row {
			if w == 0 {
				continue
			}
			i := k + 1 + m
			w /= d[k]
			d[i] += float64(w * e)
			to := l[i*n+k+1 : (i+1)*n]
			for j, v := range row {
				to[j] += float64(w * v)
			}
		}
		for m := range row {
			row[m] /= d[k]
		}
	}
	// Columns of the inverse from the last to the first row: x_k = y_k / d_k + sum_j l_kj x_j.
	inv := make([]float64, n*n)
	for k := range n {
		inv[k*n+k] = a.diag[k]
		for i := k + 1; i < n; i++ {
			w := l[k*n+i]
			if w == 0 {
				continue
			}
			to, from := inv[i*n:i*n+k+1], inv[k*n:k*n+k+1]
			for j, v := range from {
				to[j] += float64(w * v)
			}
		}
	}
	for k := n - 1; k >= 0; k-- {
		own := inv[k*n : (k+1)*n]
		for j := range own {
			own[j] /= d[k]
		}
		for i := k + 1; i < n; i++ {
			w := l[k*n+i]
			if w == 0 {
				continue
			}
			for j, v := range inv[i*n : (i+1)*n] {
				own[j] += float64(w * v)
			}
		}
	}
	return inv
}
