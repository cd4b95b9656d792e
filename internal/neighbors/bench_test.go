package neighbors

import (
	"bytes"
	"context"
	"encoding/binary"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"testing"
	"time"

	"pinfill/internal/points"
)

// BenchmarkAllNearest finds the 10 nearest of each of a million uniform points, ordering them included, and sets the
// time against SciPy's cKDTree (build and query, two workers) on the same points where Python with SciPy is there.
func BenchmarkAllNearest(b *testing.B) {
	for _, d := range []int{2, 3} {
		b.Run(fmt.Sprintf("d=%d", d), func(b *testing.B) {
			r := rand.New(rand.NewPCG(1, uint64(d)))
			m := fill(1_000_000, d, func(int, int) float64 { return r.Float64() })
			theirs, err := scipy(m, 10)
			var order, search time.Duration
			for b.Loop() {
				start := time.Now()
				s, e := points.Prepare(context.Background(), m, points.Options{Scale: points.None, Workers: 2})
				if e != nil {
					b.Fatal(e)
				}
				order += time.Since(start)
				start = time.Now()
				if _, _, e = KNearest(context.Background(), s.Points, 10, Options{Workers: 2}); e != nil {
					b.Fatal(e)
				}
				search += time.Since(start)
			}
			b.ReportMetric(order.Seconds()/float64(b.N), "s-prepare")
			b.ReportMetric(search.Seconds()/float64(b.N), "s-search")
			if err != nil {
				b.Logf("no yardstick: %v", err)
				return
			}
			b.ReportMetric(theirs, "s-ckdtree")
			b.ReportMetric((order+search).Seconds()/float64(b.N)/theirs, "ratio")
		})
	}
}

// scipy gives the seconds cKDTree takes.
func scipy(m *points.Matrix, k int) (float64, error) {
	var in bytes.Buffer
	if err := binary.Write(&in, binary.LittleEndian, m.Data); err != nil {
		return 0, err
	}
	python := "python3"
	if p := os.Getenv("PYTHON"); p != "" {
		python = p
	}
	cmd := exec.Command(python, "testdata/ckdtree.py", fmt.Sprint(m.N), fmt.Sprint(m.D), fmt.Sprint(k))
	cmd.Stdin = &in
	out, err := cmd.Output()
	if err != nil {
		return 0, err
	}
	var build, query float64
	_, err = fmt.Sscan(string(out), &build, &query)
	return build + query, err
}
