// Package cli is the command line: one file a command, each turning flags into options, making one call into job and
// leaving the writing to it. Main is the entry point; exit codes are decided here and nowhere else.
package cli

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"runtime/debug"
	"strings"
	"syscall"

	"github.com/spf13/pflag"
	"golang.org/x/sys/unix"

	"pinfill/internal/fault"
)

// streams are the three standard streams; tests put their own in place.
type streams struct {
	in       io.Reader
	out, err io.Writer
}

// Main runs the program on os.Args and gives the exit code.
func Main() int {
	return run(os.Args[1:], streams{in: os.Stdin, out: os.Stdout, err: os.Stderr})
}

// caught is the signal that ended the run, kept as the context's cause.
type caught struct{ sig syscall.Signal }

func (c caught) Error() string { return "stopped by signal " + c.sig.String() }

// run executes one command line. A panic is a defect of the program and exits 70, never the runtime's 2.
func run(args []string, s streams) (code int) {
	defer func() {
		if r := recover(); r != nil {
			fmt.Fprintf(s.err, "pinfill: internal error: %v; this is a defect, please report it with the command line\n%s", r, debug.Stack())
			code = fault.Bug
		}
	}()
	ctx, stop := catchSignals()
	defer stop()
	warnClosedOutput(s.err)

	a := newApp(s)
	if err := a.unknownCommand(args); err != nil {
		return a.report(ctx, err)
	}
	a.root.SetArgs(args)
	err := a.root.ExecuteContext(ctx)
	return a.report(ctx, errors.Join(err, a.helpFailed))
}

// catchSignals gives a context that ends at the first INT, TERM or HUP. SIGPIPE is taken too, so that a write into a
// closed pipe comes back as an error and temporary files can be removed before the program leaves with 141.
func catchSignals() (context.Context, func()) {
	ctx, cancel := context.WithCancelCause(context.Background())
	ch := make(chan os.Signal, 1)
	signal.Notify(ch, syscall.SIGINT, syscall.SIGTERM, syscall.SIGHUP)
	pipe := make(chan os.Signal, 1)
	signal.Notify(pipe, syscall.SIGPIPE)
	done := make(chan struct{})
	go func() {
		select {
		case sig := <-ch:
			cancel(caught{sig.(syscall.Signal)})
		case <-done:
		}
	}()
	return ctx, func() { signal.Stop(ch); signal.Stop(pipe); close(done); cancel(nil) }
}

// report prints err, one line each, and gives the exit code.
func (a *app) report(ctx context.Context, err error) int {
	if err == nil {
		return fault.OK
	}
	var c caught
	if errors.As(context.Cause(ctx), &c) && errors.Is(err, context.Canceled) {
		return fault.Signal + int(c.sig)
	}
	if errors.Is(err, syscall.EPIPE) {
		return fault.Signal + int(syscall.SIGPIPE) // the reader has what it wanted: silent, as the shell expects
	}
	err = a.explainFlag(err)
	for line := range strings.SplitSeq(err.Error(), "\n") {
		fmt.Fprintf(a.err, "pinfill: %s\n", line)
	}
	return fault.ExitCode(err)
}

// explainFlag turns the flag library's errors into refusals of our own shape.
func (a *app) explainFlag(err error) error {
	var missing *pflag.NotExistError
	var noValue *pflag.ValueRequiredError
	var bad *pflag.InvalidValueError
	var syntax *pflag.InvalidSyntaxError
	switch {
	case errors.As(err, &bad):
		var own *fault.Error
		if errors.As(bad.Unwrap(), &own) {
			return own
		}
		return fault.Usagef("P09", "flag --%s: value %s: %v", bad.GetFlag().Name, fault.Quote(bad.GetValue()), bad.Unwrap())
	case errors.As(err, &noValue):
		return fault.Usagef("P09", "flag --%s needs a value", noValue.GetFlag().Name)
	case errors.As(err, &missing):
		return fault.Usagef("P09", "unknown flag %s%s", fault.Quote(missing.GetSpecifiedName()), nearest(missing.GetSpecifiedName(), a.knownFlags()))
	case errors.As(err, &syntax):
		return fault.Usagef("P09", "%v", syntax)
	}
	return err
}

// warnClosedOutput says so when standard output was closed before the program began: the Go runtime then puts
// /dev/null, opened for reading and writing, in its place, and results written there would vanish with exit 0.
// A shell's >/dev/null is opened for writing only and stays silent.
func warnClosedOutput(w io.Writer) {
	flags, err := unix.FcntlInt(1, unix.F_GETFL, 0)
	if err != nil || flags&unix.O_ACCMODE != unix.O_RDWR {
		return
	}
	var out, null unix.Stat_t
	if unix.Fstat(1, &out) != nil || unix.Stat("/dev/null", &null) != nil || out.Rdev != null.Rdev || out.Mode&unix.S_IFMT != unix.S_IFCHR {
		return
	}
	fmt.Fprintln(w, "pinfill: warning: standard output is closed or discarded; give -o FILE to keep the result [S06]")
}
