package table

import (
	"io/fs"
	"sync/atomic"
	"syscall"
)

// faultyFS is the system's files with the k-th call failing, once or from then on.
type faultyFS struct {
	OS
	calls   atomic.Int64
	k       int64 // 0 fails none
	forever bool
	errno   syscall.Errno
	short   bool // a failing write takes half of its bytes first
}

// fail counts a call and gives the error it shall fail with.
func (f *faultyFS) fail() error {
	n := f.calls.Add(1)
	if f.k > 0 && (n == f.k || n > f.k && f.forever) {
		return f.errno
	}
	return nil
}

func (f *faultyFS) Open(name string) (File, error) {
	if err := f.fail(); err != nil {
		return nil, &fs.PathError{Op: "open", Path: name, Err: err}
	}
	file, err := f.OS.Open(name)
	return f.wrap(file, err)
}

func (f *faultyFS) OpenFile(name string, flag int, perm fs.FileMode) (File, error) {
	if err := f.fail(); err != nil {
		return nil, &fs.PathError{Op: "open", Path: name, Err: err}
	}
	file, err := f.OS.OpenFile(name, flag, perm)
	return f.wrap(file, err)
}

func (f *faultyFS) wrap(file File, err error) (File, error) {
	if err != nil {
		return nil, err
	}
	return &faultyFile{file, f}, nil
}

func (f *faultyFS) Stat(name string) (fs.FileInfo, error) {
	if err := f.fail(); err != nil {
		return nil, &fs.PathError{Op: "stat", Path: name, Err: err}
	}
	return f.OS.Stat(name)
}

func (f *faultyFS) Lstat(name string) (fs.FileInfo, error) {
	if err := f.fail(); err != nil {
		return nil, &fs.PathError{Op: "lstat", Path: name, Err: err}
	}
	return f.OS.Lstat(name)
}

func (f *faultyFS) Link(a, b string) error {
	if err := f.fail(); err != nil {
		return err
	}
	return f.OS.Link(a, b)
}

func (f *faultyFS) Rename(a, b string) error {
	if err := f.fail(); err != nil {
		return err
	}
	return f.OS.Rename(a, b)
}

func (f *faultyFS) Remove(name string) error {
	if err := f.fail(); err != nil {
		return err
	}
	return f.OS.Remove(name)
}

type faultyFile struct {
	File
	fs *faultyFS
}

func (f *faultyFile) Read(p []byte) (int, error) {
	if err := f.fs.fail(); err != nil {
		return 0, err
	}
	return f.File.Read(p)
}

func (f *faultyFile) ReadAt(p []byte, off int64) (int, error) {
	if err := f.fs.fail(); err != nil {
		return 0, err
	}
	return f.File.ReadAt(p, off)
}

func (f *faultyFile) Write(p []byte) (int, error) {
	if err := f.fs.fail(); err != nil {
		n := 0
		if f.fs.short {
			n, _ = f.File.Write(p[:len(p)/2])
		}
		return n, err
	}
	return f.File.Write(p)
}

func (f *faultyFile) Stat() (fs.FileInfo, error) {
	if err := f.fs.fail(); err != nil {
		return nil, err
	}
	return f.File.Stat()
}

func (f *faultyFile) Chmod(mode fs.FileMode) error {
	if err := f.fs.fail(); err != nil {
		return err
	}
	return f.File.Chmod(mode)
}

func (f *faultyFile) Sync() error {
	if err := f.fs.fail(); err != nil {
		return err
	}
	return f.File.Sync()
}

func (f *faultyFile) Close() error {
	err := f.fs.fail()
	if real := f.File.Close(); err == nil {
		err = real
	}
	return err
}
