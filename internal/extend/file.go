package extend

import (
	"archive/zip"
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"hash/crc32"
	"io"
	"math"
	"strconv"

	"pinfill/internal/points"
)

// Format is the version of the model file's layout.
const Format = 1

// ErrNotModel says that a file is no model of this program.
var ErrNotModel = errors.New("not a pinfill model")

// manifest is model.json: the model's plain fields and the checksum of each array.
type manifest struct {
	*Model
	Arrays map[string]string `json:"arrays"` // name -> SHA-256 of its bytes
}

// Arrays of the container, little-endian float64.
const (
	pointsArray = "points.f64" // N x D, row-major
	localArray  = "local.f64"  // N
	scoresArray = "scores.f64" // classes x N
	spreadArray = "spread.f64" // N, or nothing for classes
	modelName   = "model.json"
)

// WriteTo writes the model: a zip container with model.json and the arrays, uncompressed, without clock times, so that
// the same model gives the same bytes.
func (m *Model) WriteTo(w io.Writer) (int64, error) {
	m.describe()
	arrays := []struct {
		name string
		data []byte
	}{
		{pointsArray, toBytes(m.Points.Data)},
		{localArray, toBytes(m.Local)},
		{scoresArray, toBytes(m.Scores...)},
		{spreadArray, toBytes(m.Spread)},
	}
	man := manifest{Model: m, Arrays: map[string]string{}}
	for _, a := range arrays {
		sum := sha256.Sum256(a.data)
		man.Arrays[a.name] = hex.EncodeToString(sum[:])
	}
	head, err := json.MarshalIndent(man, "", "  ")
	if err != nil {
		return 0, err
	}
	count := &counter{w: w}
	z := zip.NewWriter(count)
	if err := store(z, modelName, append(head, '\n')); err != nil {
		return count.n, err
	}
	for _, a := range arrays {
		if err := store(z, a.name, a.data); err != nil {
			return count.n, err
		}
	}
	err = z.Close()
	return count.n, err
}

// describe sets the plain fields that follow from the others.
func (m *Model) describe() {
	m.Program, m.Format, m.Rows, m.Dims, m.PText = "pinfill", Format, m.Points.N, m.Points.D, pText(m.P)
}

// store adds one uncompressed entry whose sizes stand in its own header, so that the file can be mapped.
func store(z *zip.Writer, name string, data []byte) error {
	h := &zip.FileHeader{Name: name, Method: zip.Store, CRC32: crc32.ChecksumIEEE(data), CompressedSize64: uint64(len(data)), UncompressedSize64: uint64(len(data))}
	w, err := z.CreateRaw(h)
	if err != nil {
		return err
	}
	_, err = w.Write(data)
	return err
}

type counter struct {
	w io.Writer
	n int64
}

func (c *counter) Write(b []byte) (int, error) {
	n, err := c.w.Write(b)
	c.n += int64(n)
	return n, err
}

// Read makes a model of a file's bytes. Anything that was cut off, altered or written by another version is an error;
// nothing in the file makes it allocate more than a few times the file's size.
func Read(b []byte) (*Model, error) {
	z, err := zip.NewReader(bytes.NewReader(b), int64(len(b)))
	if err != nil {
		return nil, fmt.Errorf("%w: %v", ErrNotModel, err)
	}
	entries := map[string][]byte{}
	for _, f := range z.File {
		data, err := entry(f, b)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", f.Name, err)
		}
		if _, twice := entries[f.Name]; twice {
			return nil, fmt.Errorf("%s stands twice", f.Name)
		}
		entries[f.Name] = data
	}
	man := manifest{Model: &Model{}}
	if entries[modelName] == nil {
		return nil, fmt.Errorf("%w: it has no %s", ErrNotModel, modelName)
	}
	if err := json.Unmarshal(entries[modelName], &man); err != nil {
		return nil, fmt.Errorf("%w: %v", ErrNotModel, err)
	}
	m := man.Model
	if m.Program != "pinfill" {
		return nil, ErrNotModel
	}
	if m.Format != Format {
		return nil, fmt.Errorf("model of format %d, this program reads format %d; save it again with label --model", m.Format, Format)
	}
	for _, name := range []string{pointsArray, localArray, scoresArray, spreadArray} {
		sum := sha256.Sum256(entries[name])
		if man.Arrays[name] != hex.EncodeToString(sum[:]) {
			return nil, fmt.Errorf("%s does not match its checksum: the file was altered or cut off", name)
		}
	}
	return m, m.fill(entries)
}

// entry is the content of a stored entry, part of the file's own bytes.
func entry(f *zip.File, b []byte) ([]byte, error) {
	if f.Method != zip.Store || f.CompressedSize64 != f.UncompressedSize64 {
		return nil, errors.New("compressed, and models are not")
	}
	at, err := f.DataOffset()
	if err != nil {
		return nil, err
	}
	if at < 0 || f.CompressedSize64 > uint64(len(b)) || uint64(at)+f.CompressedSize64 > uint64(len(b)) {
		return nil, errors.New("cut off")
	}
	data := b[at : uint64(at)+f.CompressedSize64]
	if crc32.ChecksumIEEE(data) != f.CRC32 {
		return nil, errors.New("altered: its checksum does not match")
	}
	return data, nil
}

// fill takes the arrays and checks that everything fits.
func (m *Model) fill(entries map[string][]byte) error {
	p, err := parseP(m.PText)
	if err != nil {
		return err
	}
	m.P = p
	n, d := m.Rows, m.Dims
	values := len(entries[pointsArray]) / 8
	if n < 1 || d < 1 || n > values || d > values || n*d != values || len(entries[localArray]) != 8*n {
		return fmt.Errorf("%d points of %d columns do not fit arrays of %d and %d bytes", n, d, len(entries[pointsArray]), len(entries[localArray]))
	}
	scores := fromBytes(entries[scoresArray])
	if len(scores) == 0 || len(scores)%n != 0 {
		return fmt.Errorf("%d scores for %d points", len(scores), n)
	}
	m.Points = &points.Matrix{N: n, D: d, Data: fromBytes(entries[pointsArray])}
	m.Local = fromBytes(entries[localArray])
	if len(entries[spreadArray]) > 0 {
		m.Spread = fromBytes(entries[spreadArray])
	}
	for at := 0; at < len(scores); at += n {
		m.Scores = append(m.Scores, scores[at:at+n:at+n])
	}
	return m.validate()
}

func pText(p float64) string {
	if math.IsInf(p, 1) {
		return "inf"
	}
	return strconv.FormatFloat(p, 'g', -1, 64)
}

func parseP(s string) (float64, error) {
	if s == "inf" {
		return math.Inf(1), nil
	}
	return strconv.ParseFloat(s, 64)
}

func toBytes(arrays ...[]float64) []byte {
	var b []byte
	for _, a := range arrays {
		for _, v := range a {
			b = binary.LittleEndian.AppendUint64(b, math.Float64bits(v))
		}
	}
	return b
}

func fromBytes(b []byte) []float64 {
	v := make([]float64, len(b)/8)
	for i := range v {
		v[i] = math.Float64frombits(binary.LittleEndian.Uint64(b[8*i:]))
	}
	return v
}
