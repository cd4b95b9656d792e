package table

import (
	"io"
	"io/fs"
	"os"
)

// FS is every call this package makes on files, so that a test can fail any one of them.
type FS interface {
	Open(name string) (File, error)
	OpenFile(name string, flag int, perm fs.FileMode) (File, error)
	Stat(name string) (fs.FileInfo, error)
	Lstat(name string) (fs.FileInfo, error)
	Readlink(name string) (string, error)
	Link(oldName, newName string) error
	Rename(oldName, newName string) error
	Remove(name string) error
}

// File is an open file, or an open folder for Sync.
type File interface {
	io.ReadWriteCloser
	io.ReaderAt
	Stat() (fs.FileInfo, error)
	Chmod(mode fs.FileMode) error
	Sync() error
}

// OS is the operating system's files.
type OS struct{}

var _ FS = OS{}

// Open opens a file for reading.
func (OS) Open(name string) (File, error) { return wrapFile(os.Open(name)) }

// OpenFile opens a file with flags.
func (OS) OpenFile(name string, flag int, perm fs.FileMode) (File, error) {
	return wrapFile(os.OpenFile(name, flag, perm))
}

// wrapFile keeps a nil *os.File from becoming a File that is not nil.
func wrapFile(f *os.File, err error) (File, error) {
	if err != nil {
		return nil, err
	}
	return f, nil
}

// Stat follows symlinks.
func (OS) Stat(name string) (fs.FileInfo, error) { return os.Stat(name) }

// Lstat does not follow symlinks.
func (OS) Lstat(name string) (fs.FileInfo, error) { return os.Lstat(name) }

// Readlink gives a symlink's target.
func (OS) Readlink(name string) (string, error) { return os.Readlink(name) }

// Link makes a hard link.
func (OS) Link(oldName, newName string) error { return os.Link(oldName, newName) }

// Rename replaces newName by oldName.
func (OS) Rename(oldName, newName string) error { return os.Rename(oldName, newName) }

// Remove removes a file.
func (OS) Remove(name string) error { return os.Remove(name) }
