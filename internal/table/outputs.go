package table

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"sync/atomic"
	"syscall"

	"pinfill/internal/fault"
)

// Outputs is the set of files one run writes. Each is written to a temporary file in its own folder; Commit puts all
// in place or none, and until then old files stay whole. Standard output, FIFOs and devices are written directly.
//
// Check and Create belong to one goroutine; Abort may be called from any.
type Outputs struct {
	FS      FS        // nil is the operating system's
	Stdout  io.Writer // where "-" goes
	Inputs  []string  // files the run reads; none may be an output
	InPlace bool      // an output may replace an input after all

	mu      sync.Mutex // over files' temporary names and handles, and the renames
	state   atomic.Int32
	files   []*Output
	counter int
}

// state is how far a set of outputs has come.
type state int32

const (
	open state = iota
	committed
	aborted
)

// errAborted is what writing to an aborted set gives.
var errAborted = errors.New("the outputs were dropped")

// Output is one output being written.
type Output struct {
	set  *Outputs
	name string // as the user typed it
	path string // with symlinks followed; "" for standard output
	temp string // "" when written directly
	old  fs.FileInfo
	file File // nil for standard output and after closing
	sink *sink
}

func (o *Outputs) now() state { return state(o.state.Load()) }

func (o *Outputs) fs() FS {
	if o.FS == nil {
		return OS{}
	}
	return o.FS
}

// Check refuses, before any work is done, outputs that could not be written: a folder that is missing or closed to
// writing (S01), an output that is an input or another output (S10). It leaves nothing behind. Empty names are skipped.
func (o *Outputs) Check(names ...string) error {
	paths := make([]string, 0, len(names))
	for _, name := range names {
		if name == "" {
			continue
		}
		path, info, err := o.target(name)
		if err != nil {
			return err
		}
		if err := o.apart(name, path, info, paths); err != nil {
			return err
		}
		paths = append(paths, path)
		if path == "" || direct(info) {
			continue
		}
		f, temp, err := o.temporary(path, name, 0o600)
		if err != nil {
			return err
		}
		f.Close()
		if err := o.fs().Remove(temp); err != nil {
			return folderFault(name, err)
		}
	}
	return nil
}

// Create opens an output. "-" is standard output. A name that ends in .gz or .zst is compressed.
func (o *Outputs) Create(name string) (*Output, error) {
	o.mu.Lock()
	defer o.mu.Unlock()
	if o.now() != open {
		return nil, errAborted
	}
	path, info, err := o.target(name)
	if err != nil {
		return nil, err
	}
	others := make([]string, len(o.files))
	for i, f := range o.files {
		others[i] = f.path
	}
	if err := o.apart(name, path, info, others); err != nil {
		return nil, err
	}
	f := &Output{set: o, name: name, path: path, old: info}
	switch {
	case path == "":
		f.sink = newSink(f, o.Stdout, "")
	case direct(info):
		if f.file, err = o.fs().OpenFile(path, os.O_WRONLY, 0); err != nil {
			return nil, folderFault(name, err)
		}
		f.sink = newSink(f, f.file, name)
	default:
		if f.file, f.temp, err = o.temporary(path, name, 0o666); err != nil {
			return nil, err
		}
		if info != nil { // whoever closed the old file to others did not open the new one
			if err := f.file.Chmod(info.Mode().Perm()); err != nil {
				f.file.Close()
				o.fs().Remove(f.temp)
				return nil, f.fault(err)
			}
		}
		f.sink = newSink(f, f.file, name)
	}
	o.files = append(o.files, f)
	return f, nil
}

// maxLinks is how many symlinks in a row are followed, the kernel's own number.
const maxLinks = 40

// target follows symlinks to the file that name stands for, which need not exist; info is nil then. Standard output
// is "".
func (o *Outputs) target(name string) (string, fs.FileInfo, error) {
	if name == "-" {
		return "", nil, nil
	}
	if name == "" {
		return "", nil, folderFault(name, errors.New("the name is empty"))
	}
	path := name
	for range maxLinks {
		info, err := o.fs().Lstat(path)
		switch {
		case errors.Is(err, fs.ErrNotExist):
			if strings.HasSuffix(path, string(filepath.Separator)) {
				return "", nil, folderFault(name, err)
			}
			return path, nil, nil
		case err != nil:
			return "", nil, folderFault(name, err)
		case info.IsDir():
			return "", nil, folderFault(name, syscall.EISDIR)
		case info.Mode()&fs.ModeSymlink == 0:
			return path, info, nil
		}
		to, err := o.fs().Readlink(path)
		if err != nil {
			return "", nil, folderFault(name, err)
		}
		if !filepath.IsAbs(to) {
			to = filepath.Join(filepath.Dir(path), to)
		}
		// /proc/self/fd/N and /dev/stdout lead to names like "pipe:[1]" that only the link itself opens.
		if target, err := o.fs().Stat(path); err == nil && !target.Mode().IsRegular() && !target.IsDir() {
			return path, target, nil
		}
		path = to
	}
	return "", nil, folderFault(name, syscall.ELOOP)
}

// direct tells whether an existing output is written in place: it is no regular file.
func direct(info fs.FileInfo) bool { return info != nil && !info.Mode().IsRegular() }

// apart refuses an output that is one of the others or one of the inputs, by whatever name or link.
func (o *Outputs) apart(name, path string, info fs.FileInfo, others []string) error {
	for _, other := range others {
		if o.same(path, info, other) {
			return fault.Usagef("S10", "two outputs go to %s", fault.Name(name))
		}
	}
	if o.InPlace || path == "" || direct(info) {
		return nil
	}
	for _, in := range o.Inputs {
		if in == "-" || in == "" {
			continue
		}
		if there, err := o.fs().Stat(in); err == nil && info != nil && os.SameFile(there, info) {
			e := fault.Usagef("S10", "the output %s is the input %s", fault.Name(name), fault.Name(in))
			e.Hint = "name another file, or pass --in-place to replace it"
			return e
		}
	}
	return nil
}

// same tells whether two targets are one file.
func (o *Outputs) same(path string, info fs.FileInfo, other string) bool {
	if path == "" || other == "" {
		return path == other
	}
	if direct(info) {
		return false // two streams into one pipe or device harm no file
	}
	if there, err := o.fs().Stat(other); err == nil && info != nil {
		return os.SameFile(there, info)
	}
	a, errA := o.fs().Stat(filepath.Dir(path))
	b, errB := o.fs().Stat(filepath.Dir(other))
	return filepath.Base(path) == filepath.Base(other) && errA == nil && errB == nil && os.SameFile(a, b)
}

// temporary makes a new file beside path; the kernel takes the umask off perm.
func (o *Outputs) temporary(path, name string, perm fs.FileMode) (File, string, error) {
	for range 1000 {
		o.counter++
		temp := filepath.Join(filepath.Dir(path), fmt.Sprintf(".pinfill-%d-%d.tmp", os.Getpid(), o.counter))
		f, err := o.fs().OpenFile(temp, os.O_WRONLY|os.O_CREATE|os.O_EXCL, perm)
		if errors.Is(err, fs.ErrExist) {
			continue // left by a run that was killed
		}
		if err != nil {
			return nil, "", folderFault(name, err)
		}
		return f, temp, nil
	}
	return nil, "", folderFault(name, fs.ErrExist)
}

// folderFault says that an output cannot be made where it should stand.
func folderFault(name string, err error) error {
	return &fault.Error{
		Exit: fault.File, Code: "S01", File: name, Message: "cannot be written: " + reason(err),
		Hint: "check the folder and its permissions", Err: err,
	}
}

// reason is the system's word without the path, which the message names already.
func reason(err error) string {
	var errno syscall.Errno
	if errors.As(err, &errno) {
		return errno.Error()
	}
	return err.Error()
}
