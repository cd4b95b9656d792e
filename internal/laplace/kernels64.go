package laplace

import "unsafe"

// apply sets y = A x for rows lo..hi-1 in difference form, x and y holding width interleaved vectors.
func (a *sddm) apply(width int, x, y []float64, lo, hi int) {
	if width == 1 {
		a.apply1(x, y, lo, hi)
	} else {
		a.apply4(x, y, lo, hi)
	}
}

func (a *sddm) apply1(x, y []float64, lo, hi int) {
	xp := unsafe.Pointer(unsafe.SliceData(x)) // columns were checked against n when the matrix was made
	ptr, excess := a.ptr[lo:hi+1], a.excess[lo:hi]
	y = y[lo:hi]
	for i, e := range excess {
		xi := x[lo+i]
		cols := a.col[ptr[i]:ptr[i+1]]
		w := a.w[ptr[i]:][:len(cols)]
		var s, t float64
		k := 0
		for ; k+1 < len(cols); k += 2 {
			s += float64(w[k] * (xi - *(*float64)(unsafe.Add(xp, int(cols[k])*8))))
			t += float64(w[k+1] * (xi - *(*float64)(unsafe.Add(xp, int(cols[k+1])*8))))
		}
		if k < len(cols) {
			s += float64(w[k] * (xi - *(*float64)(unsafe.Add(xp, int(cols[k])*8))))
		}
		y[i] = float64(e*xi) + (s + t)
	}
}

// apply4 sums each of the four vectors in the order of apply1, so that a vector's answer does not depend on company.
func (a *sddm) apply4(x, y []float64, lo, hi int) {
	xp := unsafe.Pointer(unsafe.SliceData(x))
	ptr, excess := a.ptr[lo:hi+1], a.excess[lo:hi]
	y = y[4*lo : 4*hi]
	for i, e := range excess {
		v := (*[4]float64)(x[4*(lo+i):])
		x0, x1, x2, x3 := v[0], v[1], v[2], v[3]
		cols := a.col[ptr[i]:ptr[i+1]]
		ws := a.w[ptr[i]:][:len(cols)]
		var s0, s1, s2, s3, t0, t1, t2, t3 float64
		k := 0
		for ; k+1 < len(cols); k += 2 {
			w := ws[k]
			v := (*[4]float64)(unsafe.Add(xp, int(cols[k])*32))
			s0 += float64(w * (x0 - v[0]))
			s1 += float64(w * (x1 - v[1]))
			s2 += float64(w * (x2 - v[2]))
			s3 += float64(w * (x3 - v[3]))
			w = ws[k+1]
			v = (*[4]float64)(unsafe.Add(xp, int(cols[k+1])*32))
			t0 += float64(w * (x0 - v[0]))
			t1 += float64(w * (x1 - v[1]))
			t2 += float64(w * (x2 - v[2]))
			t3 += float64(w * (x3 - v[3]))
		}
		if k < len(cols) {
			w := ws[k]
			v := (*[4]float64)(unsafe.Add(xp, int(cols[k])*32))
			s0 += float64(w * (x0 - v[0]))
			s1 += float64(w * (x1 - v[1]))
			s2 += float64(w * (x2 - v[2]))
			s3 += float64(w * (x3 - v[3]))
		}
		to := (*[4]float64)(y[4*i:])
		to[0] = float64(e*x0) + (s0 + t0)
		to[1] = float64(e*x1) + (s1 + t1)
		to[2] = float64(e*x2) + (s2 + t2)
		to[3] = float64(e*x3) + (s3 + t3)
	}
}
