package table

import (
	"crypto/sha256"
	"errors"
	"hash"
	"io"
	"strings"
	"syscall"

	"pinfill/internal/fault"

	"github.com/klauspost/compress/gzip"
	"github.com/klauspost/compress/zstd"
)

const sinkSize = 1 << 18 // bytes gathered before a write

// sink is the way of bytes into one output: compression, then hashing, then a buffer, then the file.
type sink struct {
	in     io.Writer      // what the caller's bytes go into
	pack   io.WriteCloser // nil where nothing is compressed
	buf    []byte
	out    io.Writer
	hash   hash.Hash
	bytes  int64
	ended  bool
	failed error
	owner  *Output
}

func newSink(owner *Output, out io.Writer, name string) *sink {
	s := &sink{out: out, hash: sha256.New(), owner: owner}
	s.in = (*raw)(s)
	switch {
	case strings.HasSuffix(name, ".gz"):
		z, _ := gzip.NewWriterLevel((*raw)(s), gzip.DefaultCompression) // no name and no time in the header: same bytes
		s.pack, s.in = z, z
	case strings.HasSuffix(name, ".zst"):
		z, _ := zstd.NewWriter((*raw)(s), zstd.WithEncoderConcurrency(1)) // one worker: the same bytes on any machine
		s.pack, s.in = z, z
	}
	return s
}

// raw is the part of a sink below the compression.
type raw sink

func (r *raw) Write(p []byte) (int, error) {
	s := (*sink)(r)
	if s.failed != nil {
		return 0, s.failed
	}
	s.hash.Write(p)
	s.bytes += int64(len(p))
	if len(s.buf) == 0 && len(p) >= sinkSize {
		return len(p), s.push(p)
	}
	s.buf = append(s.buf, p...)
	if len(s.buf) < sinkSize {
		return len(p), nil
	}
	err := s.push(s.buf)
	s.buf = s.buf[:0]
	return len(p), err
}

// push writes p to the file.
func (s *sink) push(p []byte) error {
	if s.failed == nil && len(p) > 0 {
		n, err := s.out.Write(p)
		if err == nil && n < len(p) {
			err = io.ErrShortWrite
		}
		if err != nil {
			s.failed = s.owner.fault(err)
		}
	}
	return s.failed
}

// end writes what is left; the hash is final then.
func (s *sink) end() error {
	if s.ended {
		return s.failed
	}
	s.ended = true
	if s.pack != nil {
		if err := s.pack.Close(); err != nil && s.failed == nil {
			s.failed = s.owner.fault(err)
		}
	}
	err := s.push(s.buf)
	s.buf = nil
	return err
}

// Write writes p. Its errors are refusals: exit 4 with the path and the system's reason.
func (f *Output) Write(p []byte) (int, error) {
	if f.set.now() != open || f.sink.ended {
		return 0, errAborted
	}
	if f.sink.failed != nil {
		return 0, f.sink.failed
	}
	n, err := f.sink.in.Write(p)
	if err != nil && f.sink.failed != nil {
		err = f.sink.failed // not as the compressor put it
	}
	return n, err
}

// Finish writes what is still in buffers: nothing can be written to the output any more, and Bytes and SHA256 are
// final. Commit finishes what is not.
func (f *Output) Finish() error {
	if f.set.now() == aborted {
		return errAborted
	}
	return f.sink.end()
}

// Name is the output's name as the user typed it.
func (f *Output) Name() string { return f.name }

// Bytes is the number of bytes of the finished output, compressed if it is.
func (f *Output) Bytes() int64 { return f.sink.bytes }

// SHA256 is the hash of the finished output's bytes.
func (f *Output) SHA256() (sum [sha256.Size]byte) {
	f.sink.hash.Sum(sum[:0])
	return sum
}

// fault says that writing failed. A closed pipe behind standard output has the exit code a signal would give.
func (f *Output) fault(err error) error {
	var e *fault.Error
	if errors.As(err, &e) {
		return e
	}
	code := "S02"
	if f.path == "" {
		code = "S04"
		if errors.Is(err, syscall.EPIPE) {
			return &fault.Error{Exit: fault.Signal + int(syscall.SIGPIPE), Code: "S05", File: f.name, Message: "the reader of standard output is gone", Err: err}
		}
	}
	return &fault.Error{Exit: fault.File, Code: code, File: f.name, Message: "cannot be written: " + reason(err), Hint: hintFor(err), Err: err}
}

func hintFor(err error) string {
	switch {
	case errors.Is(err, syscall.ENOSPC), errors.Is(err, syscall.EDQUOT):
		return "make room on the disk; nothing was changed"
	case errors.Is(err, syscall.EFBIG):
		return "raise the file size limit (ulimit -f); nothing was changed"
	}
	return ""
}
