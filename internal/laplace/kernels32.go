package laplace

import "unsafe"

// apply sets y = A' x for rows lo..hi-1, x and y holding width interleaved vectors. It takes nearly all the time of a
// cycle, so the rows are handed to a kernel that reads without bounds checks: columns were checked when the network
// was made. A kernel adds entry k of each quad into its k-th sum and the four sums as (0+1)+(2+3), the same for one
// vector and for four, in assembly and in Go: a vector's answer depends on neither its company nor the processor.
func (l *level) apply(width int, x, y []float32, lo, hi int) {
	if lo >= hi {
		return
	}
	_, _, _ = l.tie[hi-1], x[l.n*width-1], y[hi*width-1] // the last bounds checks
	quads := unsafe.SliceData(l.quads[l.start[lo]:])
	if width == 1 {
		rows1(quads, &l.start[lo], &l.tie[lo], unsafe.SliceData(x), &x[lo], &y[lo], hi-lo)
	} else {
		rows4(quads, &l.start[lo], &l.tie[lo], unsafe.SliceData(x), &x[4*lo], &y[4*lo], hi-lo)
	}
}

// at is p[i].
func at[T any](p *T, i int) *T {
	return (*T)(unsafe.Add(unsafe.Pointer(p), i*int(unsafe.Sizeof(*p))))
}

// rows1Go applies rows of a level: quads and start belong to the first row, own is x at the first row, y its answer.
func rows1Go(quads *quad, start *int32, tie, x, own, y *float32, rows int) {
	k := 0
	for i := range rows {
		xi := *at(own, i)
		var s0, s1, s2, s3 float32
		for end := k + int(*at(start, i+1)-*at(start, i)); k < end; k++ {
			e := at(quads, k)
			s0 += float32(e.w[0] * (xi - *at(x, int(e.col[0]))))
			s1 += float32(e.w[1] * (xi - *at(x, int(e.col[1]))))
			s2 += float32(e.w[2] * (xi - *at(x, int(e.col[2]))))
			s3 += float32(e.w[3] * (xi - *at(x, int(e.col[3]))))
		}
		*at(y, i) = float32(*at(tie, i)*xi) + ((s0 + s1) + (s2 + s3))
	}
}

// rows4Go is rows1Go for four interleaved vectors.
func rows4Go(quads *quad, start *int32, tie, x, own, y *float32, rows int) {
	k := 0
	for i := range rows {
		v := *(*[4]float32)(unsafe.Pointer(at(own, 4*i)))
		var s [4][4]float32 // by entry of the quad, by vector
		for end := k + int(*at(start, i+1)-*at(start, i)); k < end; k++ {
			e := at(quads, k)
			for q, w := range e.w {
				u := (*[4]float32)(unsafe.Pointer(at(x, 4*int(e.col[q]))))
				s[q][0] += float32(w * (v[0] - u[0]))
				s[q][1] += float32(w * (v[1] - u[1]))
				s[q][2] += float32(w * (v[2] - u[2]))
				s[q][3] += float32(w * (v[3] - u[3]))
			}
		}
		to := (*[4]float32)(unsafe.Pointer(at(y, 4*i)))
		t := *at(tie, i)
		for c := range to {
			to[c] = float32(t*v[c]) + ((s[0][c] + s[1][c]) + (s[2][c] + s[3][c]))
		}
	}
}

// firstResidual sets r = g - A' (damping g), the residual after a sweep from zero.
func (l *level) firstResidual(width int, g, r []float32, lo, hi int) {
	l.apply(width, g, r, lo, hi)
	g, r = g[lo*width:hi*width], r[lo*width:hi*width]
	for i, v := range r {
		r[i] = g[i] - float32(damping*v)
	}
}

// restrict sets to_I = sum share_i r_i over the members of I.
func (l *level) restrict(width int, r, to []float32, lo, hi int) {
	first := l.m.ptr[lo]
	for g := lo; g < hi; g++ {
		last := l.m.ptr[g+1]
		list, share := l.m.list[first:last], l.share[first:last]
		first = last
		if width == 1 {
			var s float32
			for k, i := range list {
				s += float32(share[k] * r[i])
			}
			to[g] = s
			continue
		}
		var s0, s1, s2, s3 float32
		for k, i := range list {
			w, v := share[k], (*[4]float32)(r[4*int(i):])
			s0 += float32(w * v[0])
			s1 += float32(w * v[1])
			s2 += float32(w * v[2])
			s3 += float32(w * v[3])
		}
		v := (*[4]float32)(to[4*g:])
		v[0], v[1], v[2], v[3] = s0, s1, s2, s3
	}
}

// prolong sets x = damping g + P c.
func (l *level) prolong(width int, g, c, x []float32, lo, hi int) {
	for i := lo; i < hi; i++ {
		to := int(l.agg[i])
		if width == 1 {
			v := float32(damping * g[i])
			if to >= 0 {
				v += c[to]
			}
			x[i] = v
			continue
		}
		gv, xv := (*[4]float32)(g[4*i:]), (*[4]float32)(x[4*i:])
		var v [4]float32
		if to >= 0 {
			v = *(*[4]float32)(c[4*to:])
		}
		xv[0] = float32(damping*gv[0]) + v[0]
		xv[1] = float32(damping*gv[1]) + v[1]
		xv[2] = float32(damping*gv[2]) + v[2]
		xv[3] = float32(damping*gv[3]) + v[3]
	}
}

// sweep sets out = x + damping (g - A' x).
func (l *level) sweep(width int, g, x, out []float32, lo, hi int) {
	l.apply(width, x, out, lo, hi)
	g, x, out = g[lo*width:hi*width], x[lo*width:hi*width], out[lo*width:hi*width]
	for i, v := range out {
		out[i] = x[i] + float32(damping*(g[i]-v))
	}
}

// product sets v = A' c and to = c.v, c.g, g.g.
func (l *level) product(width int, c, g, v []float32, to *[3]scalars, lo, hi int) {
	l.apply(width, c, v, lo, hi)
	d := l.d[lo:hi]
	for k := range width {
		var cv, cg, gg float64
		at := lo*width + k
		for _, di := range d {
			ci, gi := float64(c[at]), float64(g[at])
			dc := di * ci
			cv += float64(dc * float64(v[at]))
			cg += float64(dc * gi)
			gg += float64(di * gi * gi)
			at += width
		}
		to[0][k], to[1][k], to[2][k] = cv, cg, gg
	}
}

// subtract sets r = g - step v and to = r.r.
func (l *level) subtract(width int, g, v, r []float32, step *scalars, to *[3]scalars, lo, hi int) {
	d := l.d[lo:hi]
	for k := range width {
		var rr float64
		a := float32(step[k])
		at := lo*width + k
		for _, di := range d {
			t := g[at] - float32(a*v[at])
			r[at] = t
			rr += float64(di * float64(t) * float64(t))
			at += width
		}
		to[0][k] = rr
	}
}

// products sets to = c.v1, c.A'c, c.r, leaving A'c in scratch.
func (l *level) products(width int, c, v1, r, scratch []float32, to *[3]scalars, lo, hi int) {
	l.apply(width, c, scratch, lo, hi)
	d := l.d[lo:hi]
	for k := range width {
		var cv, cc, cr float64
		at := lo*width + k
		for _, di := range d {
			dc := di * float64(c[at])
			cv += float64(dc * float64(v1[at]))
			cc += float64(dc * float64(scratch[at]))
			cr += float64(dc * float64(r[at]))
			at += width
		}
		to[0][k], to[1][k], to[2][k] = cv, cc, cr
	}
}

// combine sets c1 = step c1 + second c2.
func (l *level) combine(width int, step *scalars, c1 []float32, second *scalars, c2 []float32, lo, hi int) {
	for k := range width {
		a, b := float32(step[k]), float32(second[k])
		for at := lo*width + k; at < hi*width; at += width {
			v := float32(a * c1[at])
			if b != 0 {
				v += float32(b * c2[at])
			}
			c1[at] = v
		}
	}
}
