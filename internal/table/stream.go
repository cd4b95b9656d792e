package table

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"sync"

	"pinfill/internal/fault"
	"pinfill/internal/parallel"
)

// Stream reads a table batch by batch in constant memory. One goroutine reads and cuts the text into pieces of whole
// rows, several look at pieces, and Next hands the batches on in order.
type Stream struct {
	ctx   context.Context // ends the reading
	head  *head
	src   *source
	order chan *work // pieces in file order
	stop  context.CancelFunc
	gone  chan struct{} // closed when the reading goroutine has ended

	rowBytes float64 // average length of the first lines

	rows  int64
	lines int          // before the next block
	blank *fault.Error // blank lines that end the last batch: wrong if a row follows
	err   error        // what Next gives from now on
}

// work is one piece under way.
type work struct {
	piece piece
	last  bool
	done  chan struct{}
	out   *scanned
	err   error // of reading; out is nil then
	panic any   // a defect met on a worker, raised again where the caller is
}

// OpenStream opens a table for reading in batches; name "-" is stdin. It reads and checks the header. Close it.
func OpenStream(ctx context.Context, name string, stdin io.Reader, o Options) (*Stream, error) {
	return openStream(ctx, name, stdin, o, true)
}

func openStream(ctx context.Context, name string, stdin io.Reader, o Options, hashed bool) (*Stream, error) {
	h := &head{name: name, given: o.Delimiter != 0, noHeader: o.NoHeader}
	o = o.withDefaults(name)
	h.delim, h.decimal, h.workers, h.memory = o.Delimiter, o.Decimal, parallel.Workers(o.Workers), o.Memory
	h.maxField, h.maxRows = o.MaxField, o.MaxRows
	if err := o.check(); err != nil {
		return nil, err
	}
	for _, text := range o.NA {
		h.na = append(h.na, trimSpace([]byte(text)))
	}
	s := &Stream{head: h}
	r, err := s.open(ctx, stdin, &o, hashed)
	if err != nil {
		return nil, err
	}
	s.ctx, s.stop = context.WithCancel(ctx)
	s.start(s.ctx, r.first, r.cut)
	return s, nil
}

// opened is what open has found.
type opened struct {
	src   *source
	first *piece // begins with the first row
	cut   *cutter
	err   error
}

// open opens the source and reads the header. It returns when ctx ends even where a pipe still waits for its writer.
func (s *Stream) open(ctx context.Context, stdin io.Reader, o *Options, hashed bool) (opened, error) {
	done := make(chan opened, 1)
	go func() {
		var r opened
		if r.src, r.err = openSource(s.head.name, stdin, *o, hashed); r.err == nil {
			s.src = r.src
			if r.first, r.cut, r.err = s.begin(o); r.err != nil {
				r.src.close()
			}
		}
		done <- r
	}()
	select {
	case r := <-done:
		return r, r.err
	case <-ctx.Done():
		go func() {
			if r := <-done; r.err == nil {
				r.src.close()
			}
		}()
		return opened{}, context.Cause(ctx)
	}
}

// begin reads the header and gives the piece that follows it.
func (s *Stream) begin(o *Options) (*piece, *cutter, error) {
	start := make([]byte, 4096)
	n, err := io.ReadFull(s.src, start)
	if err != nil && err != io.EOF && err != io.ErrUnexpectedEOF {
		return nil, nil, err
	}
	start = start[:n]
	if err := checkStart(s.head.name, start); err != nil {
		return nil, nil, err
	}
	if bytes.HasPrefix(start, utf8Mark) {
		s.head.mark, start = start[:3:3], start[3:]
	}
	cut := &cutter{in: io.MultiReader(bytes.NewReader(start), s.src), o: o, name: s.head.name, off: int64(len(s.head.mark))}
	blank := 0
	for {
		p, err := cut.next()
		if err == io.EOF {
			return nil, nil, s.empty(blank)
		}
		if err != nil {
			return nil, nil, err
		}
		if isBlank(p.data) {
			blank++
			continue
		}
		if blank > 0 {
			e := &fault.Error{Exit: fault.Input, Code: "C19", File: s.head.name, Line: 1, Column: 1, Message: "a blank line before the header", Hint: "remove it"}
			return nil, nil, e
		}
		return s.afterHead(p, cut, o)
	}
}

// isBlank tells whether text is nothing but line ends, LF or CRLF.
func isBlank(text []byte) bool {
	for len(text) > 0 {
		end := bytes.IndexByte(text, '\n') + 1
		if end == 0 || len(trimEnd(text[:end])) > 0 {
			return false
		}
		text = text[end:]
	}
	return true
}

// afterHead reads the header off p and sees to it that a row follows in the piece it gives.
func (s *Stream) afterHead(p piece, cut *cutter, o *Options) (*piece, *cutter, error) {
	if !s.head.noHeader && len(s.head.firstRow(p)) >= len(bytes.TrimRight(p.data, "\r\n")) {
		more, err := cut.next()
		if err == nil {
			p.data = append(p.data, more.data...)
		} else if err != io.EOF {
			if _, _, first := s.head.headEnd(p); first != nil {
				return nil, nil, first // the header comes first in the file
			}
			moveDown(err, bytes.Count(p.data, []byte{'\n'}))
			return nil, nil, err
		}
	}
	rest, err := readHead(s.head, p, o)
	s.lines = bytes.Count(s.head.raw, []byte{'\n'})
	s.rowBytes = float64(len(rest.data)) / float64(max(1, bytes.Count(rest.data, []byte{'\n'})))
	return &rest, cut, err
}

func (s *Stream) empty(blank int) error {
	message := "the file is empty: 0 bytes"
	if s.src.bytes.Load() > 0 || blank > 0 {
		message = fmt.Sprintf("no header and no rows: %d bytes that hold no text", s.src.bytes.Load())
	}
	return &fault.Error{Exit: fault.Input, Code: "C18", File: s.head.name, Message: message, Hint: "check the step that writes it"}
}

// start sets the goroutines going.
func (s *Stream) start(ctx context.Context, first *piece, cut *cutter) {
	workers := s.head.workers
	s.order = make(chan *work, 2*workers)
	s.gone = make(chan struct{})
	todo := make(chan *work, 2*workers)
	var scanning sync.WaitGroup
	for range workers {
		scanning.Go(func() {
			for w := range todo {
				s.head.scanWork(w)
			}
		})
	}
	go func() {
		defer close(s.gone)
		defer s.src.close()
		defer scanning.Wait()
		defer close(s.order)
		defer close(todo)
		send := func(w *work) bool {
			w.done = make(chan struct{})
			if w.err != nil {
				close(w.done)
			}
			select {
			case s.order <- w:
			case <-ctx.Done():
				return false
			}
			if w.err == nil {
				todo <- w // has room for as many as order, and order's reader waits for these
			}
			return true
		}
		p := *first
		for {
			if len(p.data) > 0 && !send(&work{piece: p, last: cut.eof && len(cut.carry) == 0}) {
				return
			}
			var err error
			if p, err = cut.next(); err == io.EOF {
				err = s.src.finish()
				if err == nil {
					return
				}
			}
			if err != nil {
				send(&work{err: err})
				return
			}
		}
	}()
}

// scanWork scans a piece and keeps a panic for the caller.
func (h *head) scanWork(w *work) {
	defer close(w.done)
	defer func() { w.panic = recover() }()
	w.out = h.scan(w.piece, w.last)
}

// Next gives the next batch of rows, or io.EOF. Batches share the header; rows count from 0 in each.
func (s *Stream) Next() (*Table, error) {
	if s.err != nil {
		return nil, s.err
	}
	b, refused, err := s.nextBlock()
	if refused != nil {
		if err == nil {
			err = single(refused)
		} else {
			err = joined(refused, err)
		}
	}
	if err != nil {
		s.err = err
		return nil, err
	}
	first := b.row == 0
	b.row = 0
	return &Table{head: s.head, blocks: []*block{b}, rows: b.rows(), first: first}, nil
}

// nextBlock gives the next block with its refusals, or what ends the reading.
func (s *Stream) nextBlock() (*block, *fault.List, error) {
	var w *work
	var ok bool
	select {
	case w, ok = <-s.order:
	case <-s.ctx.Done():
		return nil, nil, context.Cause(s.ctx)
	}
	if !ok {
		if err := context.Cause(s.ctx); err != nil {
			return nil, nil, err
		}
		if s.rows == 0 {
			return nil, nil, s.noRows()
		}
		return nil, nil, io.EOF
	}
	<-w.done
	switch {
	case w.panic != nil:
		panic(w.panic)
	case w.err != nil:
		moveDown(w.err, s.lines)
		return nil, nil, w.err
	}
	out := w.out
	for _, e := range out.refused.First {
		moveDown(e, s.lines)
	}
	if out.fatal != nil {
		moveDown(out.fatal, s.lines)
		return nil, &out.refused, out.fatal
	}
	refused := &out.refused
	if s.blank != nil && out.rows() > 0 {
		refused = &fault.List{}
		refused.Add(s.blank)
		merge(refused, &out.refused)
		s.blank = nil
	}
	if out.blank != nil && s.blank == nil {
		moveDown(out.blank, s.lines)
		s.blank = out.blank
	}
	out.row, out.line = int(s.rows), s.lines+1
	s.rows += int64(out.rows())
	s.lines += out.lines
	if s.rows > s.head.maxRows {
		return nil, nil, &fault.Error{Exit: fault.Limit, Code: "C21", File: s.head.name, Message: fmt.Sprintf("more than %d rows", s.head.maxRows), Hint: "split the table"}
	}
	return &out.block, refused, nil
}

func (s *Stream) noRows() error {
	return &fault.Error{Exit: fault.Input, Code: "C17", File: s.head.name, Line: 1, Message: "the table has a header and 0 data rows", Hint: "check the step that writes it"}
}

// merge appends the refusals of b to a.
func merge(a, b *fault.List) {
	for _, e := range b.First {
		a.Add(e)
	}
	a.Total += b.Total - len(b.First)
}

// Head is a table without rows that knows the columns.
func (s *Stream) Head() *Table { return &Table{head: s.head} }

// Bytes gives the number of bytes read as stored; final once Next has given io.EOF.
func (s *Stream) Bytes() int64 { return s.src.bytes.Load() }

// SHA256 gives the hash of the stored bytes; final once Next has given io.EOF.
func (s *Stream) SHA256() [32]byte { return s.src.sum() }

// Close ends the reading and closes the file. It may be called more than once. It does not wait for standard input,
// whose writer may have nothing to say for long.
func (s *Stream) Close() {
	s.stop()
	if s.src.file != nil {
		s.src.file.Close() // wakes a read that waits; the reading goroutine closes the rest
		<-s.gone
	}
}
