//go:build !amd64

package laplace

func rows1(quads *quad, start *int32, tie, x, own, y *float32, rows int) {
	rows1Go(quads, start, tie, x, own, y, rows)
}

func rows4(quads *quad, start *int32, tie, x, own, y *float32, rows int) {
	rows4Go(quads, start, tie, x, own, y, rows)
}

func csr1(col *int32, w *float64, ptr *int, excess, x, own, y *float64, rows int) {
	csr1Go(col, w, ptr, excess, x, own, y, rows)
}

func csr4(col *int32, w *float64, ptr *int, excess, x, own, y *float64, rows int) {
	csr4Go(col, w, ptr, excess, x, own, y, rows)
}
