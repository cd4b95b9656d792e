package graph

import (
	"fmt"
	"math"
	"strings"
)

// Kernel is the function phi that turns a distance into a weight, w = phi(distance / bandwidth).
type Kernel int

// The kernels, with t = distance / bandwidth > 0.
const (
	Gaussian     Kernel = iota // exp(-t^2/2)
	Exponential                // exp(-t)
	Epanechnikov               // max(0, 1-t^2): no edge from t = 1 on
	Box                        // 1 for t <= 1, no edge beyond
	// Inverse is 1/t. In the slope energy the weighted difference (h/d)|f_i - f_j| is then h times the true slope
	// along the edge, so p = inf bounds the slope in the units of the points, and a bandwidth that is one number
	// multiplies all weights alike and leaves the answer as it is; a local bandwidth does not. The weight grows
	// without bound as two points approach: pairs far closer than the rest tie their labels together.
	Inverse
)

var kernelNames = []string{"gaussian", "exponential", "epanechnikov", "box", "inverse"}

// String gives the kernel's name as ParseKernel reads it.
func (k Kernel) String() string {
	if k < 0 || int(k) >= len(kernelNames) {
		return fmt.Sprintf("kernel %d", int(k))
	}
	return kernelNames[k]
}

// Kernels lists the names of the kernels.
func Kernels() []string { return append([]string(nil), kernelNames...) }

// ParseKernel finds a kernel by name.
func ParseKernel(name string) (Kernel, error) {
	for k, n := range kernelNames {
		if n == name {
			return Kernel(k), nil
		}
	}
	return 0, fmt.Errorf("no kernel %q; the kernels are %s", name, strings.Join(kernelNames, ", "))
}

// Compact says that the kernel is zero from some t on, so that it cuts edges.
func (k Kernel) Compact() bool { return k == Epanechnikov || k == Box }

// Log gives ln phi(t) for t > 0 with t2 = t^2; -Inf where phi is zero. The square is asked for so that a local
// bandwidth, whose t^2 is rational in the distances, needs no root for the Gaussian.
func (k Kernel) Log(t2 float64) float64 {
	switch k {
	case Gaussian:
		return -t2 / 2
	case Exponential:
		return -math.Sqrt(t2)
	case Epanechnikov:
		if t2 >= 1 {
			return math.Inf(-1)
		}
		return math.Log1p(-t2)
	case Box:
		if t2 > 1 {
			return math.Inf(-1)
		}
		return 0
	case Inverse:
		return -math.Log(t2) / 2
	}
	return math.NaN()
}
