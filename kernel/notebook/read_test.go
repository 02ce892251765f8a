package notebook

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

const smallest = `{"cells": [], "metadata": {}, "nbformat": 4, "nbformat_minor": 5}`

func TestBadNotebooksGetOneClearLine(t *testing.T) {
	for _, c := range []struct{ name, content, want string }{
		{"empty", " \n", "is empty, not a notebook"},
		{"not UTF-8", "{\"a\": \"\xff\"}", "is not a notebook: it is not UTF-8 text"},
		{"not JSON", "{\n \"cells\": [\n  oops\n", "is not JSON: line 3: invalid character 'o' looking for beginning of value"},
		{"cut short", "{\n \"cells\": [\n", "is not JSON: line 3: it ends in the middle"},
		{"something after it", smallest + "\n{}", "is not JSON: line 2: something follows the end of the notebook"},
		{"an unfinished merge", "{\n<<<<<<< HEAD\n}", "is not JSON: it holds the marks of an unfinished merge (<<<<<<<); finish the merge first"},
		{"another JSON value", `[1]`, "is JSON, but not a notebook"},
		{"another JSON object", `{"a": 1}`, "is JSON, but not a notebook: it has no nbformat number"},
		{"format 3", `{"nbformat": 3, "worksheets": []}`, "is a notebook of the old format 3; open and save it once in a notebook front end, which makes it format 4"},
		{"format 5", `{"nbformat": 5}`, "is a notebook of format 5, newer than this program can read (4); save it as format 4"},
		{"no cells", `{"nbformat": 4}`, "is not a whole notebook: it has no list of cells"},
		{"a cell that is none", `{"nbformat": 4, "cells": [{"cell_type": "code"}, 7]}`, "is not a whole notebook: entry 2 of its cells is not a cell"},
		{
			"another language", `{"nbformat": 4, "cells": [], "metadata": {"kernelspec": {"language": "go"}, "language_info": {"name": "julia"}}}`,
			"is a notebook in julia; only notebooks in Go can be run: choose the Brinkline kernel for it",
		},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := Parse([]byte(c.content))
			if err == nil || err.Error() != c.want {
				t.Errorf("got %v\nwant %s", err, c.want)
			}
		})
	}
}

func TestFilesThatCannotBeRead(t *testing.T) {
	folder := t.TempDir()
	missing := filepath.Join(folder, "missing.ipynb")
	for _, c := range []struct{ path, want string }{
		{missing, "there is no file " + missing},
		{folder, folder + " is a folder; name a notebook file in it"},
	} {
		if _, err := Read(c.path); err == nil || err.Error() != c.want {
			t.Errorf("got %v\nwant %s", err, c.want)
		}
	}
}

func TestReadsWhatOthersWrite(t *testing.T) {
	for name, content := range map[string]string{
		"a byte order mark":         "\ufeff" + smallest,
		"a later minor version":     strings.Replace(smallest, `minor": 5`, `minor": 7`, 1),
		"no metadata at all":        `{"cells": [], "nbformat": 4}`,
		"a language of other case":  `{"cells": [], "nbformat": 4, "metadata": {"language_info": {"name": "Go"}}}`,
		"a kernel of unknown speak": `{"cells": [], "nbformat": 4, "metadata": {"kernelspec": {"name": "x"}}}`,
	} {
		if _, err := Parse([]byte(content)); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
}

// What a notebook says must survive reading and writing, whatever it is.
func FuzzParse(f *testing.F) {
	content, err := os.ReadFile(reference)
	if err != nil {
		f.Fatal(err)
	}
	f.Add(content)
	f.Add([]byte(smallest))
	f.Add([]byte(`{"cells":[{"cell_type":"code","source":["a\u2028\u0000","b"],"outputs":[{}],"metadata":7}],"nbformat":4,"x":-0.0e-0}`))
	f.Fuzz(func(t *testing.T, content []byte) {
		nb, err := Parse(content)
		if err != nil {
			return
		}
		if string(nb.Bytes()) != string(content) {
			t.Error("unchanged, but written differently")
		}
		again, err := Parse(nb.encode())
		if err != nil {
			t.Fatalf("what was written can't be read: %v", err)
		}
		if diff := cmp.Diff(nb.tree, again.tree, cmp.AllowUnexported(Cell{})); diff != "" {
			t.Errorf("read back differently:\n%s", diff)
		}
		for _, c := range nb.Cells {
			_, _, _ = c.Caption(), c.Outputs(), c.Tagged("parameters")
		}
	})
}
