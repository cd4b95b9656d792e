package laplace

// rows1 and rows4 are rows1Go and rows4Go with the arithmetic of four lanes at once (SSE2, which every amd64 has).

//go:noescape
func rows1(quads *quad, start *int32, tie, x, own, y *float32, rows int)

//go:noescape
func rows4(quads *quad, start *int32, tie, x, own, y *float32, rows int)
