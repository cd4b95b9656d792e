package table

import (
	"bytes"
	"crypto/sha256"
	"errors"
	"fmt"
	"hash"
	"io"
	"io/fs"
	"sync/atomic"
	"time"

	"pinfill/internal/fault"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"
)

// maxWindow is the largest zstd window accepted, that of zstd --long=27.
const maxWindow = 128 << 20

// source is an open input: the bytes as stored, counted and hashed, and the text that comes out of them.
type source struct {
	name   string // as the user typed it
	text   io.Reader
	packed string // "gzip", "zstd" or ""
	size   int64  // bytes of text where it is known before reading, else -1

	file  File         // nil for standard input
	stat  [2]any       // size and modification time when opened, to notice a change
	zstd  io.Closer    // nil unless packed with zstd
	bytes atomic.Int64 // stored bytes read so far
	hash  hash.Hash    // of the stored bytes; nil where the caller keeps the bytes and hashes them itself
}

// openSource opens name, or takes stdin for "-", and looks through gzip and zstd by content.
func openSource(name string, stdin io.Reader, o Options, hashed bool) (*source, error) {
	s := &source{name: name, size: -1}
	var in io.Reader
	if name == "-" {
		in = stdin
	} else {
		f, err := o.FS.Open(name)
		if err != nil {
			return nil, unreadable(name, err)
		}
		s.file, in = f, f
		info, err := f.Stat()
		if err == nil && info.IsDir() {
			err = errors.New("is a directory")
		}
		if err != nil {
			s.close()
			return nil, unreadable(name, err)
		}
		if info.Mode().IsRegular() {
			s.stat = [2]any{info.Size(), info.ModTime()}
			s.size = info.Size()
		}
	}
	if err := s.look(in, hashed, o); err != nil {
		s.close()
		return nil, err
	}
	return s, nil
}

// look reads the first bytes and puts the decompressor they ask for in the way.
func (s *source) look(in io.Reader, hashed bool, o Options) error {
	first := make([]byte, 8)
	n, err := io.ReadFull(in, first)
	if err != nil && err != io.EOF && err != io.ErrUnexpectedEOF {
		return unreadable(s.name, err)
	}
	first = first[:n]
	s.packed = packing(first)
	if hashed || s.packed != "" {
		s.hash = sha256.New()
	}
	stored := &storedReader{s: s, in: io.MultiReader(bytes.NewReader(first), in)}
	s.text = stored
	switch s.packed {
	case "":
		return nil
	case "gzip":
		z, err := gzip.NewReader(stored)
		if err != nil {
			return s.damaged(err)
		}
		s.text = z
	case "zstd":
		z, err := zstd.NewReader(stored, zstd.WithDecoderConcurrency(1), zstd.WithDecoderMaxWindow(maxWindow), zstd.WithDecoderLowmem(true))
		if err != nil {
			return s.damaged(err)
		}
		s.text, s.zstd = z, z.IOReadCloser()
	}
	s.size = -1
	return nil
}

// packing names the compression that the first bytes of a file show.
func packing(first []byte) string {
	switch {
	case bytes.HasPrefix(first, []byte{0x1f, 0x8b}):
		return "gzip"
	case bytes.HasPrefix(first, []byte{0x28, 0xb5, 0x2f, 0xfd}),
		len(first) >= 4 && first[0]&0xf0 == 0x50 && bytes.Equal(first[1:4], []byte{0x2a, 0x4d, 0x18}): // skippable frame, RFC 8878 3.1.2
		return "zstd"
	}
	return ""
}

// Read gives text. Its errors are refusals.
func (s *source) Read(p []byte) (int, error) {
	n, err := s.text.Read(p)
	if err == nil || err == io.EOF {
		return n, err
	}
	var e *fault.Error
	switch {
	case errors.As(err, &e):
		return n, e
	case s.packed != "":
		return n, s.damaged(err)
	}
	return n, unreadable(s.name, err)
}

// finish is called at the end of the text: it reads what a decompressor left and refuses a file that changed while
// it was read.
func (s *source) finish() error {
	if s.stat[0] == nil {
		return nil
	}
	info, err := s.file.Stat()
	if err != nil {
		return unreadable(s.name, err)
	}
	size, modified := s.stat[0].(int64), s.stat[1].(time.Time)
	if info.Size() == size && info.ModTime().Equal(modified) && s.bytes.Load() == size {
		return nil
	}
	found := fmt.Sprintf("it had %d bytes at the start, %d were read and it has %d now", size, s.bytes.Load(), info.Size())
	if info.Size() == size && s.bytes.Load() == size {
		found = "its modification time moved"
	}
	return &fault.Error{Exit: fault.Input, Code: "S17", File: s.name, Message: "the file changed while it was read: " + found, Hint: "run again when nothing writes to it"}
}

func (s *source) close() {
	if s.zstd != nil {
		s.zstd.Close()
	}
	if s.file != nil {
		s.file.Close() // read only: nothing can be lost
	}
}

// sum gives the SHA-256 of the stored bytes read so far.
func (s *source) sum() (sum [sha256.Size]byte) {
	s.hash.Sum(sum[:0])
	return sum
}

// storedReader counts and hashes the bytes as stored.
type storedReader struct {
	s  *source
	in io.Reader
}

func (r *storedReader) Read(p []byte) (int, error) {
	n, err := r.in.Read(p)
	r.s.bytes.Add(int64(n))
	if r.s.hash != nil {
		r.s.hash.Write(p[:n])
	}
	if err != nil && err != io.EOF {
		err = unreadable(r.s.name, err)
	}
	return n, err
}

func (s *source) damaged(err error) error {
	var e *fault.Error
	if errors.As(err, &e) {
		return e
	}
	what := err.Error()
	if errors.Is(err, io.ErrUnexpectedEOF) || errors.Is(err, io.EOF) {
		what = "it ends too early"
	}
	return &fault.Error{
		Exit: fault.Input, Code: "C08", File: s.name, Message: "the " + s.packed + " data is damaged: " + what,
		Hint: "fetch or compress the file again", Err: err,
	}
}

// unreadable is a failure of the system to open or read an input.
func unreadable(name string, err error) error {
	var p *fs.PathError
	cause := err
	if errors.As(err, &p) {
		cause = p.Err
	}
	return &fault.Error{Exit: fault.File, Code: "S16", File: name, Message: "cannot be read: " + cause.Error(), Err: err}
}
