package report

import "math/rand/v2"

// MostPoints is the number of points that a map draws at most.
const MostPoints = 20_000

// Sample picks at most most of n things, increasing, each as likely as the other, and always those that keep says
// (nil for none; at most half of most of those). It is the same for the same n and seed: selection sampling, Knuth,
// The Art of Computer Programming 2, section 3.4.2, algorithm S. Time O(n).
func Sample(n, most int, seed uint64, keep []int32) []int32 {
	if n <= most {
		out := make([]int32, n)
		for i := range out {
			out[i] = int32(i)
		}
		return out
	}
	if len(keep) > most/2 {
		chosen := Sample(len(keep), most/2, seed, nil)
		for i, k := range chosen {
			chosen[i] = keep[k]
		}
		keep = chosen
	}
	rng := rand.New(rand.NewPCG(seed, 0x7069_6c6f))
	out := make([]int32, 0, most)
	left, need := n-len(keep), most-len(keep)
	for i := range n {
		switch {
		case len(keep) > 0 && int(keep[0]) == i:
			keep = keep[1:]
			out = append(out, int32(i))
			continue
		case float64(left)*rng.Float64() < float64(need):
			out = append(out, int32(i))
			need--
		}
		left--
	}
	return out
}
