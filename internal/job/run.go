package job

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"runtime"
	"runtime/debug"
	"strconv"
	"time"

	"pinfill/internal/encode"
	"pinfill/internal/fault"
)

// run is one job under way: its options, warnings, stage timings and limits.
type run struct {
	*Options
	warnings []encode.Warning
	timings  []timing
}

// timing is one row of --timings.
type timing struct {
	stage   string
	seconds float64
	peak    int64 // bytes, the process's largest resident size so far
}

// start prepares a run and gives the context that its time limit ends.
func start(ctx context.Context, o *Options) (*run, context.Context, context.CancelFunc) {
	r := &run{Options: o}
	cancel := context.CancelFunc(func() {})
	if o.TimeLimit > 0 {
		ctx, cancel = context.WithTimeoutCause(ctx, o.TimeLimit, fault.Limitf("", "the time limit of %v was reached; raise --time-limit", o.TimeLimit))
	}
	// The heap is a few large arrays without pointers, cheap to collect: collecting early costs little time and keeps
	// the peak near what is alive.
	debug.SetGCPercent(earlyCollection)
	if o.MemoryLimit > 0 {
		debug.SetMemoryLimit(o.MemoryLimit)
	}
	return r, ctx, cancel
}

// earlyCollection is the growth of the heap, in per cent, after which it is collected.
const earlyCollection = 20

// warn notes a warning for the record and tells the user.
func (r *run) warn(ws ...encode.Warning) {
	for _, w := range ws {
		r.warnings = append(r.warnings, w)
		if r.Warn != nil {
			r.Warn(w)
		}
	}
}

func (r *run) warnf(code, format string, args ...any) {
	r.warn(encode.Warning{Code: code, Text: fmt.Sprintf(format, args...)})
}

// note says a line of the summary.
func (r *run) note(format string, args ...any) {
	if r.Note != nil {
		r.Note(fmt.Sprintf(format, args...))
	}
}

// stage runs one stage under its name, with its time and memory noted.
func (r *run) stage(ctx context.Context, name string, do func() error) error {
	if err := stopped(ctx); err != nil {
		return err
	}
	r.progress(name, 0)
	began := time.Now()
	err := do()
	r.timings = append(r.timings, timing{name, time.Since(began).Seconds(), peakResident()})
	if err != nil {
		if s := stopped(ctx); s != nil && !isFault(err) {
			return s
		}
	}
	return err
}

func isFault(err error) bool {
	var e *fault.Error
	var l *fault.List
	return errors.As(err, &e) || errors.As(err, &l)
}

// stopped gives the reason for which ctx ended, or nil.
func stopped(ctx context.Context) error {
	err := ctx.Err()
	if err == nil {
		return nil
	}
	var e *fault.Error
	if cause := context.Cause(ctx); errors.As(cause, &e) {
		return e
	}
	return err
}

func (r *run) progress(stage string, share float64) {
	if r.Progress != nil {
		r.Progress(stage, share)
	}
}

// progressFor gives a stage's callback in the form numeric packages take.
func (r *run) progressFor(stage string) func(float64) {
	return func(share float64) { r.progress(stage, share) }
}

// timingsCSV is the content of --timings.
func (r *run) timingsCSV() []byte {
	var b bytes.Buffer
	b.WriteString("stage,seconds,peak_bytes\n")
	for _, t := range r.timings {
		fmt.Fprintf(&b, "%s,%s,%d\n", t.stage, strconv.FormatFloat(t.seconds, 'f', 3, 64), t.peak)
	}
	return b.Bytes()
}

// peakResident is the process's peak resident size in bytes, or the Go heap's system size where the kernel does not say.
func peakResident() int64 {
	status, err := os.ReadFile("/proc/self/status")
	if err == nil {
		if _, rest, ok := bytes.Cut(status, []byte("VmHWM:")); ok {
			var kb int64
			if _, err := fmt.Sscan(string(rest), &kb); err == nil {
				return kb * 1024
			}
		}
	}
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	return int64(m.Sys)
}

// estimateMemory is the announced peak of a run on n vertices with k neighbours: the program itself, and for each
// vertex its coordinates and the graph, its weights, the multigrid hierarchy and the solver's work, which grow with
// the edges. Fitted to measured peaks at 20,000 to 200,000 rows, p = 2 and 3, k = 10 and 20; a test holds the peak to
// 1.3 times the estimate.
func estimateMemory(n, k int) int64 {
	const program, vertex, neighbour = 16 << 20, 300, 165
	return program + int64(n)*int64(vertex+neighbour*k)
}

// needMemory refuses a run whose estimate exceeds the limit, before anything of that size is allocated.
func (r *run) needMemory(bytes int64, what string) error {
	if r.MemoryLimit > 0 && bytes > r.MemoryLimit {
		return fault.Limitf("S15", "%s needs about %s, over the limit of %s; raise --memory-limit or use --solve-on", what, sizeText(bytes), sizeText(r.MemoryLimit))
	}
	return nil
}

// sizeText writes a number of bytes for a person.
func sizeText(b int64) string {
	v := float64(b)
	for _, unit := range []string{"B", "kB", "MB", "GB"} {
		if v < 1000 {
			return strconv.FormatFloat(v, 'f', 1, 64) + " " + unit
		}
		v /= 1000
	}
	return strconv.FormatFloat(v, 'f', 1, 64) + " TB"
}
