// Package points holds rows of numbers and puts them into the form that neighbour search needs: scaled columns,
// one row for each distinct point, in an order that follows the space and not the file. Prepare does all of it; the
// Scaling it gives takes further rows to the same space.
package points

// Matrix is a dense row-major matrix of N points in D columns.
type Matrix struct {
	N, D int
	Data []float64 // Data[i*D+j] is coordinate j of point i
}

// NewMatrix gives an N by D matrix of zeros.
func NewMatrix(n, d int) *Matrix { return &Matrix{N: n, D: d, Data: make([]float64, n*d)} }

// Row is point i; it shares memory with the matrix.
func (m *Matrix) Row(i int) []float64 { return m.Data[i*m.D : (i+1)*m.D : (i+1)*m.D] }
