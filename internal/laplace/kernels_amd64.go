package laplace

// These are rows1Go, rows4Go, csr1Go and csr4Go with the arithmetic of several lanes at once (SSE2, which every amd64
// has).

//go:noescape
func rows1(quads *quad, start *int32, tie, x, own, y *float32, rows int)

//go:noescape
func rows4(quads *quad, start *int32, tie, x, own, y *float32, rows int)

//go:noescape
func csr1(col *int32, w *float64, ptr *int, excess, x, own, y *float64, rows int)

//go:noescape
func csr4(col *int32, w *float64, ptr *int, excess, x, own, y *float64, rows int)
