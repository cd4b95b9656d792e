package extend

import (
	"bytes"
	"encoding/json"
	"errors"
	"math"
	"math/rand/v2"
	"runtime"
	"strings"
	"testing"

	"pinfill/internal/graph"
	"pinfill/internal/points"
)

// someModel is a model of n random points in the plane with classes, or numbers where classes is 0.
func someModel(tb testing.TB, n, classes int) *Model {
	tb.Helper()
	rng := rand.New(rand.NewPCG(5, uint64(n)))
	raw := points.NewMatrix(n, 2)
	for i := range raw.Data {
		raw.Data[i] = rng.Float64()
	}
	space, err := points.Prepare(tb.Context(), raw, points.Options{})
	if err != nil {
		tb.Fatal(err)
	}
	m := &Model{
		Version: "test", Label: "bottom", Features: []string{"x", "y"}, Missing: "median", Median: []float64{0.5, 0.25}, Scaling: space.Scaling,
		Metric: space.Metric, K: 6, Kernel: "gaussian", Width: graph.Bandwidth{Local: true, H: 1}, Rank: graph.LocalRank, P: 3, Energy: "slope",
		Labelled: []int32{0, 3}, Bridged: []int32{2}, Trust: json.RawMessage(`{"coverage":0.9}`), Points: space.Points, Local: make([]float64, n),
	}
	for i := range m.Local {
		m.Local[i] = 0.1 + rng.Float64()
	}
	for c := range max(classes, 1) {
		m.Scores = append(m.Scores, make([]float64, n))
		for i := range m.Scores[c] {
			m.Scores[c][i] = rng.Float64()
		}
	}
	if classes > 0 {
		m.Classes = []string{"mud", "rock", "sand"}[:classes]
	} else {
		m.Spread = make([]float64, n)
	}
	return m
}

func bytesOf(tb testing.TB, m *Model) []byte {
	tb.Helper()
	var b bytes.Buffer
	n, err := m.WriteTo(&b)
	if err != nil || n != int64(b.Len()) {
		tb.Fatalf("%d bytes, said %d: %v", b.Len(), n, err)
	}
	return b.Bytes()
}

func TestFileRoundTrip(t *testing.T) {
	for _, m := range []*Model{someModel(t, 12, 3), someModel(t, 12, 0), infiniteModel(t)} {
		first := bytesOf(t, m)
		back, err := Read(first)
		if err != nil {
			t.Fatal(err)
		}
		if again := bytesOf(t, back); !bytes.Equal(first, again) {
			t.Errorf("%d classes: other bytes after reading and writing", len(m.Classes))
		}
		if back.P != m.P || back.K != m.K || back.Points.N != m.Points.N || len(back.Scores) != len(m.Scores) || back.Median[1] != 0.25 {
			t.Errorf("read back %+v", back)
		}
		for c := range m.Scores {
			for v, want := range m.Scores[c] {
				if got := back.Scores[c][v]; got != want && !(math.IsNaN(got) && math.IsNaN(want)) {
					t.Fatalf("score %d of vertex %d: %v, want %v", c, v, got, want)
				}
			}
		}
	}
}

// infiniteModel has p = inf and a vertex out of reach.
func infiniteModel(tb testing.TB) *Model {
	m := someModel(tb, 9, 2)
	m.P = math.Inf(1)
	for c := range m.Scores {
		m.Scores[c][4] = math.NaN()
	}
	return m
}

// Every byte of the file is flipped, one at a time, and every shorter file is tried: each is refused, or gives the same
// model (the file's own time stamps and comments carry nothing). All content stands under SHA-256 or, for model.json,
// CRC-32, which finds any one flipped byte.
func TestReadRefusesAlteredFiles(t *testing.T) {
	whole := bytesOf(t, someModel(t, 9, 2))
	harmless := 0
	for at := range whole {
		for _, mask := range []byte{0x01, 0x80, 0xff} {
			b := bytes.Clone(whole)
			b[at] ^= mask
			m, err := Read(b)
			if err != nil {
				continue
			}
			harmless++
			if !bytes.Equal(bytesOf(t, m), whole) {
				t.Fatalf("byte %d ^ %#x: read as another model", at, mask)
			}
		}
	}
	if harmless > len(whole)/2 {
		t.Errorf("%d of %d alterations were not noticed", harmless, 3*len(whole))
	}
	for n := range whole {
		if _, err := Read(whole[:n]); err == nil {
			t.Fatalf("the first %d of %d bytes are read as a model", n, len(whole))
		}
	}
}

func TestReadSaysWhatIsWrong(t *testing.T) {
	if _, err := Read([]byte("cell,x,y\n1,2,3\n")); !errors.Is(err, ErrNotModel) {
		t.Errorf("a table: %v", err)
	}
	for _, c := range []struct {
		name, want string
		spoil      func(m *Model)
	}{
		{"features", "features", func(m *Model) { m.Features = m.Features[:1] }},
		{"rank", "rank", func(m *Model) { m.Rank = 0 }},
		{"p", "p is", func(m *Model) { m.P = 1 }},
		{"labelled", "out of order", func(m *Model) { m.Labelled = []int32{3, 3} }},
		{"bridged", "out of order", func(m *Model) { m.Bridged = []int32{99} }},
		{"coordinate", "coordinate", func(m *Model) { m.Points.Data[3] = math.Inf(1) }},
		{"scores", "scores", func(m *Model) { m.Classes = append(m.Classes, "x") }},
	} {
		m := someModel(t, 9, 2)
		c.spoil(m)
		if _, err := Read(bytesOf(t, m)); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: error %v does not speak of %q", c.name, err, c.want)
		}
	}
}

// A later format is refused by number. The same length keeps the container whole; its checksum is mended.
func TestReadRefusesOtherFormat(t *testing.T) {
	m := someModel(t, 9, 2)
	m.Version = `","format":7,"q":"` // no: JSON escapes quotes, so this must still read as format 1
	if back, err := Read(bytesOf(t, m)); err != nil || back.Format != Format || back.Version != m.Version {
		t.Fatalf("%v", err)
	}
	b := container(t, `{"program":"pinfill","format":7}`)
	if _, err := Read(b); err == nil || !strings.Contains(err.Error(), "format 7") {
		t.Errorf("format 7: %v", err)
	}
	if _, err := Read(container(t, `{"program":"other","format":1}`)); !errors.Is(err, ErrNotModel) {
		t.Errorf("another program's container: %v", err)
	}
	if _, err := Read(container(t, `[1`)); !errors.Is(err, ErrNotModel) {
		t.Errorf("damaged JSON: %v", err)
	}
}

// A small file that claims a large table must not be believed: at most some 50 times its size may be allocated.
func TestReadAllocatesLittle(t *testing.T) {
	b := container(t, `{"program":"pinfill","format":1,"vertices":1000000000,"dimensions":1000000000,"p":"2"}`)
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	if _, err := Read(b); err == nil {
		t.Error("read a table of 1e18 numbers from a few bytes")
	}
	runtime.ReadMemStats(&after)
	if got := after.TotalAlloc - before.TotalAlloc; got > 1<<20 {
		t.Errorf("%d bytes allocated for a file of %d", got, len(b))
	}
}

func FuzzRead(f *testing.F) {
	f.Add(bytesOf(f, someModel(f, 9, 2)))
	f.Add(bytesOf(f, someModel(f, 8, 0)))
	f.Add(bytesOf(f, infiniteModel(f)))
	f.Add(container(f, `{"program":"pinfill","format":1}`))
	f.Add([]byte("PK\x05\x06"))
	f.Fuzz(func(t *testing.T, b []byte) {
		m, err := Read(b)
		if err != nil {
			return
		}
		x, err := NewExtender(t.Context(), m, 1)
		if err != nil {
			return
		}
		scores := make([]float64, len(m.Scores))
		_, _ = x.Row(make([]float64, len(m.Features)), scores, x.NewWork())
	})
}
