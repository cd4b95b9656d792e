package table

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"

	"pinfill/internal/fault"
)

// Commit puts all outputs in place. It writes out and fsyncs every one before it renames the first, so that a power
// cut finds each file old or new, never half. Files are renamed in the order of creation, those given in last at the
// end: a table after the record that describes it. A rename that fails undoes those before it.
//
// When the folder cannot be fsynced after all files are in place, the refusal S03 says so; the files stay.
func (o *Outputs) Commit(last ...*Output) error {
	if o.now() != open {
		return errAborted
	}
	if err := o.flush(); err != nil {
		o.Abort()
		return err
	}
	o.mu.Lock()
	defer o.mu.Unlock()
	if o.now() != open {
		return errAborted
	}
	if err := o.settle(); err != nil {
		o.drop()
		return err
	}
	ordered := slices.DeleteFunc(slices.Clone(o.files), func(f *Output) bool { return slices.Contains(last, f) })
	ordered = append(ordered, last...)
	err := o.place(ordered)
	if err != nil {
		o.drop()
		return err
	}
	o.state.Store(int32(committed))
	return o.syncFolders(ordered)
}

// flush writes out what is buffered. It holds no lock, for a pipe may take its time and Abort must not wait for it.
// Direct outputs go first: what fails there leaves the files alone.
func (o *Outputs) flush() error {
	for _, straight := range []bool{true, false} {
		for _, f := range o.files {
			if (f.path == "" || direct(f.old)) != straight {
				continue
			}
			if err := f.sink.end(); err != nil {
				return err
			}
		}
	}
	return nil
}

// settle fsyncs and closes the files.
func (o *Outputs) settle() error {
	for _, f := range o.files {
		if f.file == nil {
			continue
		}
		if f.temp != "" {
			if err := f.file.Sync(); err != nil {
				return f.fault(err)
			}
		}
		err := f.file.Close()
		f.file = nil
		if err != nil {
			return f.fault(err)
		}
	}
	return nil
}

// place renames the temporary files. Where more than one has to move, the old files are kept by a hard link until all
// are in place.
func (o *Outputs) place(files []*Output) error {
	files = slices.DeleteFunc(slices.Clone(files), func(f *Output) bool { return f.temp == "" }) // the caller keeps its own
	kept := make([]string, len(files))
	defer func() {
		for _, k := range kept {
			if k != "" {
				o.fs().Remove(k)
			}
		}
	}()
	for i, f := range files {
		if len(files) > 1 && f.old != nil && i < len(files)-1 {
			kept[i] = o.keep(f)
		}
	}
	for i, f := range files {
		if err := o.fs().Rename(f.temp, f.path); err != nil {
			return o.undo(files[:i], kept, f.fault(err))
		}
		f.temp = ""
	}
	return nil
}

// keep links the old file to a name beside it and gives that name, or "" on file systems without links.
func (o *Outputs) keep(f *Output) string {
	for range 1000 {
		o.counter++
		name := filepath.Join(filepath.Dir(f.path), fmt.Sprintf(".pinfill-%d-%d.old", os.Getpid(), o.counter))
		err := o.fs().Link(f.path, name)
		if err == nil {
			return name
		}
		if !errors.Is(err, os.ErrExist) {
			return ""
		}
	}
	return ""
}

// undo takes back the renames of files, the last first, and says which it could not.
func (o *Outputs) undo(files []*Output, kept []string, cause error) error {
	stuck := ""
	for i := len(files) - 1; i >= 0; i-- {
		f := files[i]
		var err error
		switch {
		case kept[i] != "":
			if err = o.fs().Rename(kept[i], f.path); err == nil {
				kept[i] = ""
			}
		case f.old == nil:
			err = o.fs().Remove(f.path)
		default:
			err = errors.New("no link to the old file")
		}
		if err != nil {
			stuck += " " + fault.Name(f.name)
		}
	}
	var e *fault.Error
	if stuck != "" && errors.As(cause, &e) {
		e.Hint = "these outputs are new already:" + stuck
	}
	return cause
}

// syncFolders makes the renames last.
func (o *Outputs) syncFolders(files []*Output) error {
	var done []string
	for _, f := range files {
		if f.path == "" || direct(f.old) {
			continue
		}
		folder := filepath.Dir(f.path)
		if slices.Contains(done, folder) {
			continue
		}
		done = append(done, folder)
		if err := o.syncFolder(folder); err != nil {
			return &fault.Error{
				Exit: fault.File, Code: "S03", File: f.name, Message: "the new file is in place, but its folder could not be synced: " + reason(err),
				Hint: "durability unknown until the system writes the folder out", Err: err,
			}
		}
	}
	return nil
}

func (o *Outputs) syncFolder(folder string) error {
	d, err := o.fs().Open(folder)
	if err != nil {
		return err
	}
	err = d.Sync()
	if c := d.Close(); err == nil {
		err = c
	}
	return err
}

// Abort drops everything that is not in place yet and removes the temporary files. It may be called at any time, more
// than once and from any goroutine; it tells whether the outputs were in place already.
func (o *Outputs) Abort() (inPlace bool) {
	o.mu.Lock()
	defer o.mu.Unlock()
	if o.now() == open {
		o.drop()
	}
	return o.now() == committed
}

func (o *Outputs) drop() {
	o.state.Store(int32(aborted))
	for _, f := range o.files {
		if f.file != nil {
			f.file.Close()
			f.file = nil
		}
		if f.temp != "" {
			o.fs().Remove(f.temp)
			f.temp = ""
		}
	}
}
