package notebook

import (
	"os"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// testdata/reference.ipynb was written by the reference implementation, nbformat
// 5.5.0, from a notebook with all kinds of cells, outputs and characters.
const reference = "testdata/reference.ipynb"

func mustRead(t *testing.T, path string) *Notebook {
	t.Helper()
	nb, err := Read(path)
	if err != nil {
		t.Fatal(err)
	}
	return nb
}

func mustParse(t *testing.T, content string) *Notebook {
	t.Helper()
	nb, err := Parse([]byte(content))
	if err != nil {
		t.Fatal(err)
	}
	return nb
}

func TestEncodesAsTheReferenceImplementation(t *testing.T) {
	want, err := os.ReadFile(reference)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), string(mustRead(t, reference).encode())); diff != "" {
		t.Errorf("encoded differently (-reference +ours):\n%s", diff)
	}
}

func TestNewOutputsAreCutIntoLinesAsTheReferenceImplementationDoes(t *testing.T) {
	nb := mustRead(t, reference)
	for i, v := range nb.Cells[1].tree["outputs"].([]any) {
		joinedUp := comparableOutput(v).(map[string]any)
		if s, ok := joinedUp["text"].(string); ok {
			text := &strings.Builder{}
			text.WriteString(s)
			joinedUp["text"] = text
		}
		if diff := cmp.Diff(v, any(stored(joinedUp))); diff != "" {
			t.Errorf("output %d (-reference +ours):\n%s", i, diff)
		}
	}
}

func TestAccessors(t *testing.T) {
	nb := mustRead(t, reference)
	code := nb.Cells[1]
	if code.Type() != "code" || code.ID() != "Code_Cell-2" || code.Number() != 1 || nb.Minor() != 5 {
		t.Errorf("type %q, id %q, number %d, minor %d", code.Type(), code.ID(), code.Number(), nb.Minor())
	}
	if !code.Tagged("parameters") || code.Tagged("other") {
		t.Error("tags are not read right")
	}
	outputs := code.Outputs()
	if name, text := outputs[0].Stream(); name != "stdout" || !strings.HasPrefix(text, "true\nform\ffeed") {
		t.Errorf("stream %q: %q", name, text)
	}
	if got, ok := outputs[1].Data("application/vnd.x+json"); !ok || got != "{\n \"a\": [\n  1.5\n ],\n \"b\": \"l1\\nl2\"\n}" {
		t.Errorf("JSON data: %q, %v", got, ok)
	}
	if got := outputs[1].Metadata("image/png", "alt"); got != "a picture" {
		t.Errorf("alt %q", got)
	}
	if name, message, traceback := outputs[3].Error(); name != "E" || message != "v" || len(traceback) != 2 {
		t.Errorf("error %q %q %q", name, message, traceback)
	}
}

func TestCaption(t *testing.T) {
	for _, c := range []struct{ source, want string }{
		{"\n\n// The tank at rest.\nx := 1", "The tank at rest."},
		{"path := start.Follow()\npath", "path := start.Follow()"},
		{"//\n  y", "y"},
		{"  \n", ""},
	} {
		cell := &Cell{map[string]any{"source": c.source}}
		if got := cell.Caption(); got != c.want {
			t.Errorf("caption of %q: %q, want %q", c.source, got, c.want)
		}
	}
}

// Reading and asking must not change what would be written.
func TestAskingChangesNothing(t *testing.T) {
	nb := mustParse(t, `{"cells": [{"cell_type": "code", "source": "x"}, {"cell_type": "future", "new": 1e5}], "nbformat": 4}`)
	for _, c := range nb.Cells {
		_ = c.Tagged("x") || c.Hidden("source")
		_, _ = c.Outputs(), c.Caption()
	}
	_ = nb.Metadata()
	if nb.Changed() {
		t.Errorf("changed to %s", nb.encode())
	}
}
