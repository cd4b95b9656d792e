package laplace

import "unsafe"

// apply sets y = A x for rows lo..hi-1 in difference form, x and y holding width interleaved vectors. As for a level,
// a kernel adds the even entries of a row into one sum and the odd ones into another, whatever the width and the
// processor.
func (a *sddm) apply(width int, x, y []float64, lo, hi int) {
	if lo >= hi {
		return
	}
	_, _, _ = a.excess[hi-1], x[a.n*width-1], y[hi*width-1] // the last bounds checks
	col, w := unsafe.SliceData(a.col[a.ptr[lo]:]), unsafe.SliceData(a.w[a.ptr[lo]:])
	if width == 1 {
		csr1(col, w, &a.ptr[lo], &a.excess[lo], unsafe.SliceData(x), &x[lo], &y[lo], hi-lo)
	} else {
		csr4(col, w, &a.ptr[lo], &a.excess[lo], unsafe.SliceData(x), &x[4*lo], &y[4*lo], hi-lo)
	}
}

// csr1Go applies rows of a: col, w and ptr belong to the first row, own is x at the first row, y its answer.
func csr1Go(col *int32, w *float64, ptr *int, excess, x, own, y *float64, rows int) {
	k := 0
	for i := range rows {
		xi := *at(own, i)
		var s [2]float64
		for end, odd := k+*at(ptr, i+1)-*at(ptr, i), 0; k < end; k++ {
			s[odd] += float64(*at(w, k) * (xi - *at(x, int(*at(col, k)))))
			odd ^= 1
		}
		*at(y, i) = float64(*at(excess, i)*xi) + (s[0] + s[1])
	}
}

// csr4Go is csr1Go for four interleaved vectors.
func csr4Go(col *int32, w *float64, ptr *int, excess, x, own, y *float64, rows int) {
	k := 0
	for i := range rows {
		v := *(*[4]float64)(unsafe.Pointer(at(own, 4*i)))
		var s [2][4]float64
		for end, odd := k+*at(ptr, i+1)-*at(ptr, i), 0; k < end; k++ {
			u, wk, sum := (*[4]float64)(unsafe.Pointer(at(x, 4*int(*at(col, k))))), *at(w, k), &s[odd]
			sum[0] += float64(wk * (v[0] - u[0]))
			sum[1] += float64(wk * (v[1] - u[1]))
			sum[2] += float64(wk * (v[2] - u[2]))
			sum[3] += float64(wk * (v[3] - u[3]))
			odd ^= 1
		}
		to := (*[4]float64)(unsafe.Pointer(at(y, 4*i)))
		e := *at(excess, i)
		for c := range to {
			to[c] = float64(e*v[c]) + (s[0][c] + s[1][c])
		}
	}
}
