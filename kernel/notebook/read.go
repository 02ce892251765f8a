package notebook

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"strings"
	"unicode/utf8"
)

// Read reads a notebook file. Its errors are one line: what is wrong with which
// file, where, and what to do.
func Read(path string) (*Notebook, error) {
	content, err := os.ReadFile(path)
	if err != nil {
		return nil, readError(path, err)
	}
	nb, err := Parse(content)
	if err != nil {
		return nil, fmt.Errorf("%s %w", path, err)
	}
	nb.path = path
	return nb, nil
}

// readError says why a file can't be read, without the names of system calls.
func readError(path string, err error) error {
	if errors.Is(err, fs.ErrNotExist) {
		return fmt.Errorf("there is no file %s", path)
	}
	if info, statErr := os.Stat(path); statErr == nil && info.IsDir() {
		return fmt.Errorf("%s is a folder; name a notebook file in it", path)
	}
	return fmt.Errorf("%s can't be read: %w", path, cause(err))
}

// cause strips the name of the system call and the path from an error.
func cause(err error) error {
	var pathError *fs.PathError
	if errors.As(err, &pathError) {
		return pathError.Err
	}
	var linkError *os.LinkError
	if errors.As(err, &linkError) {
		return linkError.Err
	}
	return err
}

// Parse reads a notebook from the content of its file. Errors continue a
// sentence that starts with the file's name.
func Parse(content []byte) (*Notebook, error) {
	tree, err := decode(content)
	if err != nil {
		return nil, err
	}
	if err := checkFormat(tree); err != nil {
		return nil, err
	}
	cells, err := cellsOf(tree)
	if err != nil {
		return nil, err
	}
	nb := &Notebook{Cells: cells, tree: tree, found: content}
	if language := nb.language(); language != "" && !strings.EqualFold(language, "go") {
		return nil, fmt.Errorf("is a notebook in %s; only notebooks in Go can be run: choose the Brinkline kernel for it", language)
	}
	nb.canonical = nb.encode()
	return nb, nil
}

func decode(content []byte) (map[string]any, error) {
	content = bytes.TrimPrefix(content, []byte("\ufeff"))
	if len(bytes.TrimSpace(content)) == 0 {
		return nil, errors.New("is empty, not a notebook")
	}
	if !utf8.Valid(content) {
		return nil, errors.New("is not a notebook: it is not UTF-8 text")
	}
	decoder := json.NewDecoder(bytes.NewReader(content))
	decoder.UseNumber()
	var value any
	if err := decoder.Decode(&value); err != nil {
		return nil, notJSON(content, decoder.InputOffset(), err)
	}
	if _, err := decoder.Token(); err != io.EOF {
		return nil, notJSON(content, decoder.InputOffset(), errors.New("something follows the end of the notebook"))
	}
	tree, ok := value.(map[string]any)
	if !ok {
		return nil, errors.New("is JSON, but not a notebook")
	}
	return tree, nil
}

// notJSON says in which line a file stops being JSON.
func notJSON(content []byte, offset int64, err error) error {
	if bytes.Contains(content, []byte("\n<<<<<<< ")) {
		return errors.New("is not JSON: it holds the marks of an unfinished merge (<<<<<<<); finish the merge first")
	}
	var syntax *json.SyntaxError
	if errors.As(err, &syntax) {
		offset = syntax.Offset
	}
	if errors.Is(err, io.ErrUnexpectedEOF) {
		offset = int64(len(content))
		err = errors.New("it ends in the middle")
	}
	line := 1 + bytes.Count(content[:min(int(offset), len(content))], []byte("\n"))
	return fmt.Errorf("is not JSON: line %d: %w", line, err)
}

func checkFormat(tree map[string]any) error {
	major, ok := integer(tree["nbformat"])
	switch {
	case !ok:
		return errors.New("is JSON, but not a notebook: it has no nbformat number")
	case major < 4:
		return fmt.Errorf("is a notebook of the old format %d; open and save it once in a notebook front end, which makes it format 4", major)
	case major > 4:
		return fmt.Errorf("is a notebook of format %d, newer than this program can read (4); save it as format 4", major)
	}
	return nil
}

func cellsOf(tree map[string]any) ([]*Cell, error) {
	list, ok := tree["cells"].([]any)
	if !ok {
		return nil, errors.New("is not a whole notebook: it has no list of cells")
	}
	cells := make([]*Cell, len(list))
	for i, v := range list {
		cell, ok := v.(map[string]any)
		if !ok || text(cell["cell_type"]) == "" {
			return nil, fmt.Errorf("is not a whole notebook: entry %d of its cells is not a cell", i+1)
		}
		cells[i] = &Cell{cell}
	}
	return cells, nil
}

// language returns the language a notebook says it is written in. The kernel
// that ran it last knows better than the kernel that was chosen for it.
func (nb *Notebook) language() string {
	for _, place := range [][2]string{{"language_info", "name"}, {"kernelspec", "language"}} {
		if name := text(object(nb.Metadata(), place[0])[place[1]]); name != "" {
			return name
		}
	}
	return ""
}
