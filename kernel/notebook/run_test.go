package notebook

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"brinkline/display"
	"brinkline/kernel/session"
)

// script is an executor that does what the test wrote for each source.
type script map[string]func(out session.Output) session.Result

func (s script) Run(_ context.Context, c session.Cell, out session.Output) session.Result {
	do, ok := s[c.Source]
	if !ok {
		return session.Result{Err: &session.Error{Name: "Error", Message: "undefined: " + c.Source, Line: 1, Traceback: []string{"cell " + c.ID}}}
	}
	return do(out)
}

func plainText(s string) display.Bundle { return display.Bundle{Data: map[string]any{"text/plain": s}} }

func says(s string) func(session.Output) session.Result {
	return func(out session.Output) session.Result {
		out.Stream("stdout", s)
		return session.Result{}
	}
}

// cells returns a notebook with one code cell a source; "source #tag" has a tag.
func cells(t *testing.T, sources ...string) *Notebook {
	t.Helper()
	nb := mustParse(t, smallest)
	for i, s := range sources {
		source, tag, _ := strings.Cut(s, " #")
		tree := map[string]any{
			"cell_type": "code", "id": fmt.Sprintf("c%d", i+1), "execution_count": nil,
			"metadata": map[string]any{}, "outputs": []any{}, "source": source,
		}
		if tag != "" {
			tree["metadata"] = map[string]any{"tags": []any{tag}}
		}
		nb.Cells = append(nb.Cells, &Cell{tree})
	}
	return nb
}

// summary writes the outputs of all cells in short.
func summary(nb *Notebook) []string {
	var all []string
	for _, c := range nb.Cells {
		s := fmt.Sprintf("%d:", c.Number())
		for _, o := range c.Outputs() {
			name, content := o.Stream()
			if plain, ok := o.Data("text/plain"); ok {
				content = plain
			}
			if ename, evalue, _ := o.Error(); ename != "" {
				content = ename + " " + evalue
			}
			s += fmt.Sprintf(" %s%s(%s)", o.Type(), name, content)
		}
		all = append(all, s)
	}
	return all
}

func expect(t *testing.T, nb *Notebook, want ...string) {
	t.Helper()
	if diff := cmp.Diff(want, summary(nb)); diff != "" {
		t.Errorf("outputs (-want +got):\n%s", diff)
	}
}

func TestRunPutsOutputsAndNumbersIntoTheCells(t *testing.T) {
	nb := cells(t, "a", "", "skip #skip-execution", "b")
	nb.Cells[2].setOutputs([]any{map[string]any{"output_type": "stream", "name": "stdout", "text": "old"}})
	value := plainText("42")
	err := Run(context.Background(), nb, script{
		"a": says("hello\n"),
		"b": func(out session.Output) session.Result {
			out.Display(plainText("shown"), "")
			return session.Result{Value: &value}
		},
	}, nil)
	if err != nil {
		t.Fatal(err)
	}
	expect(t, nb, "1: streamstdout(hello\n)", "0:", "0: streamstdout(old)", "2: display_data(shown) execute_result(42)")
}

func TestAnErrorStopsTheRunAndKeepsWhatIsThere(t *testing.T) {
	nb := cells(t, "a", "bad", "a")
	nb.Cells[2].setOutputs([]any{map[string]any{"output_type": "stream", "name": "stdout", "text": "old"}})
	err := Run(context.Background(), nb, script{
		"a": says("1"),
		"bad": func(out session.Output) session.Result {
			out.Stream("stdout", "half")
			return session.Result{Err: &session.Error{Name: "Error", Message: "no parameter", Line: 3}}
		},
	}, nil)
	if err == nil || err.Error() != "cell 2 (id c2), line 3: no parameter" {
		t.Errorf("error %v", err)
	}
	expect(t, nb, "1: streamstdout(1)", "2: streamstdout(half) error(Error no parameter)", "0: streamstdout(old)")
}

func TestAnErrorThatTheNotebookExpects(t *testing.T) {
	nb := cells(t, "bad #raises-exception", "a")
	if err := Run(context.Background(), nb, script{"a": says("on")}, nil); err != nil {
		t.Fatal(err)
	}
	expect(t, nb, "1: error(Error undefined: bad)", "2: streamstdout(on)")
}

func TestInterruptStopsEvenWhereErrorsAreExpected(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	nb := cells(t, "long #raises-exception", "a")
	err := Run(ctx, nb, script{"a": says("on"), "long": func(session.Output) session.Result {
		cancel()
		return session.Result{Err: &session.Error{Name: "Interrupted", Message: "interrupted", Interrupted: true}}
	}}, nil)
	var stopped *CellError
	if !errors.As(err, &stopped) || !stopped.Err.Interrupted || stopped.Number != 1 {
		t.Errorf("error %v", err)
	}
	expect(t, nb, "1: error(Interrupted interrupted)", "0:")
}

func TestAnExecutorThatBreaksIsAnErrorOfTheCell(t *testing.T) {
	nb := cells(t, "a", "breaks")
	err := Run(context.Background(), nb, script{"a": says("1"), "breaks": func(session.Output) session.Result { panic("out of ideas") }}, nil)
	if err == nil || err.Error() != "cell 2 (id c2): the kernel failed: out of ideas" {
		t.Errorf("error %v", err)
	}
	expect(t, nb, "1: streamstdout(1)", "2: error(InternalError the kernel failed: out of ideas)")
}

func TestInterruptBetweenCells(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	nb := cells(t, "a", "a")
	err := Run(ctx, nb, script{"a": func(session.Output) session.Result { cancel(); return session.Result{} }}, nil)
	if err == nil || err.Error() != "cell 2 (id c2): interrupted before it began" {
		t.Errorf("error %v", err)
	}
}

func TestProgressIsToldBeforeAndAfterEachCell(t *testing.T) {
	var told []string
	nb := cells(t, "a", "", "bad")
	_ = Run(context.Background(), nb, script{"a": says("")}, func(s Step) {
		told = append(told, fmt.Sprintf("%d/%d %s %v %v", s.Number, s.Of, s.Cell.ID(), s.Done, s.Err != nil))
	})
	want := []string{"1/2 c1 false false", "1/2 c1 true false", "2/2 c3 false false", "2/2 c3 true true"}
	if diff := cmp.Diff(want, told); diff != "" {
		t.Error(diff)
	}
}

// A second run of the same notebook must not change a byte, whatever the form
// in which the first outputs were stored.
func TestRunAgainChangesNothing(t *testing.T) {
	value := plainText("a\nb")
	do := script{"x": func(out session.Output) session.Result {
		out.Stream("stdout", "one\ntwo\n")
		return session.Result{Value: &value}
	}}
	nb := cells(t, "x")
	if err := Run(context.Background(), nb, do, nil); err != nil {
		t.Fatal(err)
	}
	asStrings := strings.NewReplacer("\"one\\n\",\n     \"two\\n\"", `"one\ntwo\n"`).Replace(string(nb.Bytes()))
	for _, content := range []string{string(nb.Bytes()), asStrings} {
		again := mustParse(t, content)
		if err := Run(context.Background(), again, do, nil); err != nil {
			t.Fatal(err)
		}
		if again.Changed() {
			t.Error(cmp.Diff(content, string(again.Bytes())))
		}
	}
}

func TestFilesWithoutCellIDsGetNone(t *testing.T) {
	nb := mustParse(t, `{"cells": [{"cell_type": "code", "metadata": {"tags": ["parameters"]}, "source": ["bad"], "outputs": []}], "nbformat": 4, "nbformat_minor": 4}`)
	if err := nb.SetParameters([]string{"x=1"}); err != nil {
		t.Fatal(err)
	}
	err := Run(context.Background(), nb, script{}, nil)
	if err == nil || err.Error() != "cell 1, line 1: undefined: bad" {
		t.Errorf("error %v", err)
	}
	if strings.Contains(string(nb.Bytes()), `"id"`) {
		t.Errorf("an id was added:\n%s", nb.Bytes())
	}
}

// helper is an executor that knows one name.
type helper struct{ script }

func (helper) Inspect(source string, _ int) (display.Bundle, bool) {
	return display.Bundle{}, source == "known"
}

func TestCellsThatAskForHelpShowNothing(t *testing.T) {
	nb := cells(t, "known?", "?unknown")
	err := Run(context.Background(), nb, helper{}, nil)
	if err == nil || err.Error() != "cell 2 (id c2): nothing is known of unknown" {
		t.Errorf("error %v", err)
	}
	expect(t, nb, "1:", "2: error(NameError nothing is known of unknown)")
	if err := Run(context.Background(), cells(t, "unknown?"), script{}, nil); err != nil {
		t.Errorf("an executor without help: %v", err)
	}
}

func TestWhatARunDoesNotMeanStaysAsFound(t *testing.T) {
	const content = `{
 "cells": [
  {
   "cell_type": "code",
   "execution_count": null,
   "id": "A-b_1",
   "later": {
    "z": 1.50
   },
   "metadata": {
    "collapsed": true
   },
   "outputs": [],
   "source": "a string, \n not a list"
  },
  {
   "cell_type": "poem",
   "source": [
    "in two ",
    "parts"
   ]
  },
  {
   "cell_type": "code",
   "metadata": {
    "tags": [
     "skip-execution"
    ]
   },
   "outputs": [
    {
     "output_type": "scent",
     "rose": true
    }
   ],
   "source": [
    "x"
   ]
  }
 ],
 "house": null,
 "nbformat": 4,
 "nbformat_minor": 9
}
`
	nb := mustParse(t, content)
	if err := Run(context.Background(), nb, script{"a string, \n not a list": says("")}, nil); err != nil {
		t.Fatal(err)
	}
	want := strings.Replace(content, `"execution_count": null`, `"execution_count": 1`, 1)
	if diff := cmp.Diff(want, string(nb.Bytes())); diff != "" {
		t.Error(diff)
	}
}

func TestOnlyLanguageInfoOfTheMetadataIsRefreshed(t *testing.T) {
	nb := mustRead(t, reference)
	before := string(nb.encode())
	nb.SetLanguage(map[string]any{"name": "go", "version": "1.26"})
	want := strings.Replace(before, `"version": "1.0"`, `"version": "1.26"`, 1)
	if diff := cmp.Diff(want, string(nb.encode())); diff != "" {
		t.Error(diff)
	}
}
