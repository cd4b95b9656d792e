package cli

import (
	"fmt"
	"io"
	"os"
	"strings"
	"sync"
	"time"

	"golang.org/x/term"

	"pinfill/internal/encode"
	"pinfill/internal/job"
)

// progressMode says when the progress line is shown.
type progressMode string

// verbosity is what a run says on standard error.
type verbosity struct {
	quiet, verbose bool
	progress       progressMode
}

func newVerbosity() *verbosity { return &verbosity{progress: "auto"} }

// isTerminal reports whether a stream is a terminal.
func isTerminal(stream any) bool {
	f, ok := stream.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}

// around gives the job its voice on standard error, runs it, and takes the progress line away at the end.
func (v *verbosity) around(a *app, o *job.Options, run func() error) error {
	line := &progressLine{w: a.err, terminal: isTerminal(a.err), width: terminalWidth(a.err)}
	show := v.progress == "always" || (v.progress == "auto" && line.terminal && !v.quiet)
	if show {
		o.Progress = line.step
	}
	o.Warn = func(w encode.Warning) {
		if v.quiet {
			return
		}
		code := ""
		if w.Code != "" {
			code = " [" + w.Code + "]"
		}
		line.say("pinfill: warning: " + w.Text + code)
	}
	if !v.quiet {
		o.Note = line.say
	}
	err := run()
	line.clear()
	return err
}

// progressLine is one line on standard error: stage, share, rate and time left. On a terminal it is redrawn in place
// and gone at the end; elsewhere it is a plain line at most every thirty seconds, without control characters.
type progressLine struct {
	w        io.Writer
	terminal bool
	width    int

	mu      sync.Mutex
	stage   string
	began   time.Time
	last    time.Time
	showing bool
}

const (
	redraw    = 100 * time.Millisecond // between redraws on a terminal
	plainLine = 30 * time.Second       // between lines elsewhere
)

func (p *progressLine) step(stage string, share float64) {
	p.mu.Lock()
	defer p.mu.Unlock()
	now := time.Now()
	if stage != p.stage {
		p.stage, p.began = stage, now
	}
	every := plainLine
	if p.terminal {
		every = redraw
	}
	if now.Sub(p.last) < every {
		return
	}
	if p.last.IsZero() && !p.terminal {
		p.last = now // the first line comes after the first half minute
		return
	}
	p.last = now
	text := "pinfill: " + stage
	if share > 0 {
		text += fmt.Sprintf(" %3.0f%%", 100*share)
		spent := now.Sub(p.began)
		if left := time.Duration(float64(spent) * (1 - share) / share); spent > time.Second && share < 1 {
			text += fmt.Sprintf(", %v left", left.Round(time.Second))
		}
	}
	if p.terminal {
		if len(text) >= p.width {
			text = text[:max(p.width-1, 0)]
		}
		fmt.Fprint(p.w, "\r\x1b[K"+text)
		p.showing = true
		return
	}
	fmt.Fprintln(p.w, text)
}

// say prints whole lines, above the progress line if there is one.
func (p *progressLine) say(text string) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.erase()
	fmt.Fprintln(p.w, strings.TrimRight(text, "\n"))
}

func (p *progressLine) clear() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.erase()
}

func (p *progressLine) erase() {
	if p.showing {
		fmt.Fprint(p.w, "\r\x1b[K")
		p.showing = false
	}
}

func terminalWidth(stream any) int {
	if f, ok := stream.(*os.File); ok {
		if w, _, err := term.GetSize(int(f.Fd())); err == nil && w > 20 {
			return w
		}
	}
	return 80
}
