package notebook

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"syscall"
)

// Bytes returns the content of the notebook's file: what was read when nothing
// has changed since.
func (nb *Notebook) Bytes() []byte {
	content := nb.encode()
	if nb.found != nil && bytes.Equal(content, nb.canonical) {
		return nb.found
	}
	return content
}

// Write writes the notebook, all of it or nothing. A file that holds the same
// bytes already is not touched; written tells.
func (nb *Notebook) Write(path string) (written bool, err error) {
	return WriteFile(path, nb.Bytes())
}

// EditedSince reports whether the file that the notebook was read from holds
// something else by now.
func (nb *Notebook) EditedSince() bool {
	now, err := os.ReadFile(nb.path)
	return err == nil && !bytes.Equal(now, nb.found)
}

// WriteFile writes a file by way of a temporary one beside it, so that readers
// see the old content or the new and never a part. A file that holds the same
// bytes already is not touched.
func WriteFile(path string, content []byte) (written bool, err error) {
	if old, err := os.ReadFile(path); err == nil && bytes.Equal(old, content) {
		return false, nil
	}
	if err := replace(path, content); err != nil {
		return false, writeError(path, err)
	}
	return true, nil
}

var errReadOnly = errors.New("the file is read-only")

func replace(path string, content []byte) error {
	target, mode, err := destination(path)
	if err != nil {
		return err
	}
	temporary, err := os.CreateTemp(filepath.Dir(target), "."+filepath.Base(target)+"-*")
	if err != nil {
		return err
	}
	defer os.Remove(temporary.Name()) // after the rename there is nothing to remove
	_, err = temporary.Write(content)
	err = errors.Join(err, temporary.Chmod(mode), temporary.Sync(), temporary.Close())
	if err != nil {
		return err
	}
	return os.Rename(temporary.Name(), target)
}

// destination follows a symbolic link, so that the link stays one, and returns
// the mode of the file that is there or the usual one.
func destination(path string) (target string, mode fs.FileMode, err error) {
	target, err = filepath.EvalSymlinks(path)
	if errors.Is(err, fs.ErrNotExist) {
		return path, 0o644, nil
	}
	if err != nil {
		return "", 0, err
	}
	info, err := os.Stat(target)
	if err != nil {
		return "", 0, err
	}
	switch {
	case info.IsDir():
		return "", 0, syscall.EISDIR
	case info.Mode().Perm()&0o200 == 0: // a rename would not ask
		return "", 0, errReadOnly
	}
	return target, info.Mode().Perm(), nil
}

// CheckWritable tells before a long run whether its result can be written.
func CheckWritable(path string) error {
	target, _, err := destination(path)
	if err != nil {
		return writeError(path, err)
	}
	probe, err := os.CreateTemp(filepath.Dir(target), "."+filepath.Base(target)+"-*")
	if err != nil {
		return writeError(path, err)
	}
	return errors.Join(probe.Close(), os.Remove(probe.Name()))
}

func writeError(path string, err error) error {
	switch folder := filepath.Dir(path); {
	case errors.Is(err, syscall.EISDIR):
		return fmt.Errorf("%s can't be written: it is a folder; name a file in it", path)
	case errors.Is(err, fs.ErrNotExist):
		return fmt.Errorf("%s can't be written: there is no folder %s", path, folder)
	case errors.Is(err, fs.ErrPermission), errors.Is(err, syscall.EROFS):
		return fmt.Errorf("%s can't be written: no permission to write in %s", path, folder)
	default:
		return fmt.Errorf("%s can't be written: %w", path, cause(err))
	}
}
