package laplace

import "unsafe"

// The two products below take nearly all the time of a cycle. They read without bounds checks: columns were checked
// against n when the level was made.

// apply sets y = A' x for rows lo..hi-1, x and y holding width interleaved vectors.
func (l *level) apply(width int, x, y []float32, lo, hi int) {
	if width == 1 {
		l.apply1(x, y, lo, hi)
	} else {
		l.apply4(x, y, lo, hi)
	}
}

func (l *level) apply1(x, y []float32, lo, hi int) {
	xp := unsafe.Pointer(unsafe.SliceData(x))
	quads := unsafe.Pointer(unsafe.SliceData(l.quads))
	start, tie := l.start[lo:hi+1], l.tie[lo:hi]
	y = y[lo:hi]
	k := int(start[0])
	for i := range tie {
		xi := *(*float32)(unsafe.Add(xp, (lo+i)*4))
		var s, t float32
		for end := int(start[i+1]); k < end; k++ {
			e := (*quad)(unsafe.Add(quads, k*int(unsafe.Sizeof(quad{}))))
			s += float32(e.w[0] * (xi - *(*float32)(unsafe.Add(xp, int(e.col[0])*4))))
			t += float32(e.w[1] * (xi - *(*float32)(unsafe.Add(xp, int(e.col[1])*4))))
			s += float32(e.w[2] * (xi - *(*float32)(unsafe.Add(xp, int(e.col[2])*4))))
			t += float32(e.w[3] * (xi - *(*float32)(unsafe.Add(xp, int(e.col[3])*4))))
		}
		y[i] = float32(tie[i]*xi) + (s + t)
	}
}

// apply4 sums each of the four vectors in the order of apply1, so that a vector's answer does not depend on company.
func (l *level) apply4(x, y []float32, lo, hi int) {
	xp := unsafe.Pointer(unsafe.SliceData(x))
	quads := unsafe.Pointer(unsafe.SliceData(l.quads))
	start, tie := l.start[lo:hi+1], l.tie[lo:hi]
	y = y[4*lo : 4*hi]
	k := int(start[0])
	for i := range tie {
		v := (*[4]float32)(unsafe.Add(xp, (lo+i)*16))
		x0, x1, x2, x3 := v[0], v[1], v[2], v[3]
		var s0, s1, s2, s3, t0, t1, t2, t3 float32
		for end := int(start[i+1]); k < end; k++ {
			e := (*quad)(unsafe.Add(quads, k*int(unsafe.Sizeof(quad{}))))
			w := e.w[0]
			v := (*[4]float32)(unsafe.Add(xp, int(e.col[0])*16))
			s0 += float32(w * (x0 - v[0]))
			s1 += float32(w * (x1 - v[1]))
			s2 += float32(w * (x2 - v[2]))
			s3 += float32(w * (x3 - v[3]))
			w = e.w[1]
			v = (*[4]float32)(unsafe.Add(xp, int(e.col[1])*16))
			t0 += float32(w * (x0 - v[0]))
			t1 += float32(w * (x1 - v[1]))
			t2 += float32(w * (x2 - v[2]))
			t3 += float32(w * (x3 - v[3]))
			w = e.w[2]
			v = (*[4]float32)(unsafe.Add(xp, int(e.col[2])*16))
			s0 += float32(w * (x0 - v[0]))
			s1 += float32(w * (x1 - v[1]))
			s2 += float32(w * (x2 - v[2]))
			s3 += float32(w * (x3 - v[3]))
			w = e.w[3]
			v = (*[4]float32)(unsafe.Add(xp, int(e.col[3])*16))
			t0 += float32(w * (x0 - v[0]))
			t1 += float32(w * (x1 - v[1]))
			t2 += float32(w * (x2 - v[2]))
			t3 += float32(w * (x3 - v[3]))
		}
		to := (*[4]float32)(y[4*i:])
		to[0] = float32(tie[i]*x0) + (s0 + t0)
		to[1] = float32(tie[i]*x1) + (s1 + t1)
		to[2] = float32(tie[i]*x2) + (s2 + t2)
		to[3] = float32(tie[i]*x3) + (s3 + t3)
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
		list := l.m.list[first:last]
		first = last
		if width == 1 {
			var s float32
			for _, i := range list {
				s += float32(l.share[i] * r[i])
			}
			to[g] = s
			continue
		}
		var s0, s1, s2, s3 float32
		for _, i := range list {
			w, v := l.share[i], (*[4]float32)(r[4*int(i):])
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
