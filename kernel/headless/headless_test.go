package headless

import (
	"bytes"
	"context"
	"errors"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"brinkline/kernel/notebook"
	"brinkline/kernel/session"
)

// fake is an executor for which a cell's source says what to do.
type fake struct {
	dir    string
	during func()
	closed bool
}

func (f *fake) Run(_ context.Context, c session.Cell, out session.Output) session.Result {
	f.dir, _ = os.Getwd()
	if f.during != nil {
		f.during()
	}
	if strings.Contains(c.Source, "bad") {
		return session.Result{Err: &session.Error{Name: "Error", Message: `no parameter "Coolnt"`, Line: 2, Column: 4, Hint: "did you mean Coolant?"}}
	}
	out.Stream("stdout", "ran "+c.Source+"\n")
	return session.Result{}
}

func (f *fake) Specials() []string { return []string{"fold 303.42 K"} }
func (f *fake) Close()             { f.closed = true }

func (f *fake) kernel() Kernel {
	return Kernel{
		Start:    func() (Executor, error) { return f, nil },
		Language: map[string]any{"name": "go", "version": "1.26"},
		Version:  "0.1.0",
	}
}

// enter makes an empty folder the current one and puts a notebook into it.
func enter(t *testing.T, sources ...string) {
	t.Helper()
	t.Chdir(t.TempDir())
	cells := make([]string, len(sources))
	for i, s := range sources {
		cells[i] = `{"cell_type": "code", "id": "c` + string(rune('1'+i)) + `", "execution_count": null, "metadata": {}, "outputs": [], "source": "` + s + `"}`
	}
	content := `{"cells": [` + strings.Join(cells, ", ") + `], "metadata": {}, "nbformat": 4, "nbformat_minor": 5}`
	if err := os.WriteFile("a.ipynb", []byte(content), 0o600); err != nil {
		t.Fatal(err)
	}
}

func read(t *testing.T, path string) string {
	t.Helper()
	content, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(content)
}

// timing is the only part of what a run tells that differs between runs.
var timing = regexp.MustCompile(`  \d+\.\d s`)

func run(t *testing.T, j Job, f *fake) (told string, err error) {
	t.Helper()
	var w bytes.Buffer
	err = j.Run(context.Background(), f.kernel(), &w)
	return timing.ReplaceAllString(w.String(), ""), err
}

func TestRunTellsEachCellAndWritesNotebookAndReport(t *testing.T) {
	enter(t, "// the tank\\nx", "y")
	f := &fake{}
	told, err := run(t, Job{Notebook: "a.ipynb", Output: "out.ipynb", Report: "out.html"}, f)
	if err != nil {
		t.Fatal(err)
	}
	want := "  1 of 2  the tank\n  2 of 2  y\nspecial points found:\n  fold 303.42 K\nwrote out.ipynb\nwrote out.html\n"
	if told != want {
		t.Errorf("told\n%s\nwant\n%s", told, want)
	}
	if !strings.Contains(read(t, "out.ipynb"), `"ran y\n"`) || !strings.Contains(read(t, "out.ipynb"), `"version": "1.26"`) {
		t.Error("the executed notebook lacks the output or the language")
	}
	for _, want := range []string{"ran y", "fold 303.42 K", "brinkline run a.ipynb -o out.ipynb --report out.html"} {
		if !strings.Contains(read(t, "out.html"), want) {
			t.Errorf("the report lacks %q", want)
		}
	}
	if strings.Contains(read(t, "a.ipynb"), "ran") {
		t.Error("the notebook itself was changed")
	}
	if !f.closed {
		t.Error("the session was not closed")
	}
}

func TestSecondRunInPlaceChangesNothing(t *testing.T) {
	enter(t, "x")
	job := Job{Notebook: "a.ipynb", Report: "a.html"}
	if _, err := run(t, job, &fake{}); err != nil {
		t.Fatal(err)
	}
	notebook, page := read(t, "a.ipynb"), read(t, "a.html")
	told, err := run(t, job, &fake{})
	if err != nil || !strings.HasSuffix(told, "a.ipynb says the same already\na.html says the same already\n") {
		t.Errorf("told %q, %v", told, err)
	}
	if read(t, "a.ipynb") != notebook || read(t, "a.html") != page {
		t.Error("the second run wrote other bytes")
	}
}

func TestErrorIsShownInItsLineAndKeepsWhatExists(t *testing.T) {
	enter(t, "x", "path :=\\n\\tbad()", "z")
	told, err := run(t, Job{Notebook: "a.ipynb", Report: "a.html"}, &fake{})
	var stopped *notebook.CellError
	if !errors.As(err, &stopped) || err.Error() != `cell 2 (id c2), line 2: no parameter "Coolnt"` {
		t.Errorf("error %v", err)
	}
	want := `  1 of 3  x
  2 of 3  path :=  error
      line 2:  bad()
                 ^
      did you mean Coolant?
special points found:
  fold 303.42 K
wrote a.ipynb
wrote a.html
`
	if told != want {
		t.Errorf("told\n%s\nwant\n%s", told, want)
	}
	if content := read(t, "a.ipynb"); !strings.Contains(content, "ran x") || !strings.Contains(content, `"evalue": "no parameter \"Coolnt\""`) {
		t.Error("what exists was not written")
	}
	if !strings.Contains(read(t, "a.html"), "This run stopped at") {
		t.Error("the report does not say that the run stopped")
	}
}

func TestCellsRunInTheNotebooksFolder(t *testing.T) {
	enter(t, "x")
	folder, err := filepath.EvalSymlinks(".")
	if err != nil {
		t.Fatal(err)
	}
	if err := errors.Join(os.Mkdir("sub", 0o700), os.Rename("a.ipynb", "sub/a.ipynb")); err != nil {
		t.Fatal(err)
	}
	f := &fake{}
	if _, err := run(t, Job{Notebook: "sub/a.ipynb", Output: "out.ipynb"}, f); err != nil {
		t.Fatal(err)
	}
	if filepath.Base(f.dir) != "sub" {
		t.Errorf("the cells ran in %s", f.dir)
	}
	if _, err := os.Stat(filepath.Join(folder, "out.ipynb")); err != nil {
		t.Errorf("the result is not where it was asked for: %v", err)
	}
}

func TestNothingRunsWhenTheResultCouldNotBeWritten(t *testing.T) {
	for _, c := range []struct {
		name string
		job  Job
		want string
	}{
		{"no notebook", Job{Notebook: "b.ipynb"}, "there is no file b.ipynb"},
		{"no folder for the output", Job{Notebook: "a.ipynb", Output: "no/out.ipynb"}, "no/out.ipynb can't be written: there is no folder no"},
		{"no folder for the report", Job{Notebook: "a.ipynb", Report: "no/a.html"}, "no/a.html can't be written: there is no folder no"},
		{"report over notebook", Job{Notebook: "a.ipynb", Report: "./a.ipynb"}, "the report would overwrite the notebook a.ipynb; give it another name"},
		{"report over output", Job{Notebook: "a.ipynb", Output: "o", Report: "o"}, "the report would overwrite the notebook o; give it another name"},
		{"nothing to set", Job{Notebook: "a.ipynb", Settings: []string{"x=1"}}, `no cell carries the tag "parameters", so there is nothing to set; tag the cell that holds the parameters`},
	} {
		t.Run(c.name, func(t *testing.T) {
			enter(t, "x")
			told, err := run(t, c.job, &fake{during: func() { t.Error("a cell ran") }})
			if err == nil || err.Error() != c.want || told != "" {
				t.Errorf("got %v\nwant %s\ntold %q", err, c.want, told)
			}
		})
	}
}

func TestNotebookSavedByTheUserDuringTheRunIsNotOverwritten(t *testing.T) {
	enter(t, "x")
	theirs := strings.Replace(read(t, "a.ipynb"), `"x"`, `"x, improved"`, 1)
	f := &fake{during: func() {
		if err := os.WriteFile("a.ipynb", []byte(theirs), 0o600); err != nil {
			t.Error(err)
		}
	}}
	_, err := run(t, Job{Notebook: "a.ipynb"}, f)
	want := "a.ipynb was saved by somebody else during the run and is left as it is; the executed notebook is a-executed.ipynb"
	if err == nil || err.Error() != want {
		t.Errorf("error %v", err)
	}
	if read(t, "a.ipynb") != theirs || !strings.Contains(read(t, "a-executed.ipynb"), "ran x") {
		t.Error("an edit or a result was lost")
	}
}

func TestSessionThatDoesNotStart(t *testing.T) {
	enter(t, "x")
	before := read(t, "a.ipynb")
	k := Kernel{Start: func() (Executor, error) { return nil, errors.New("no memory") }}
	if err := (Job{Notebook: "a.ipynb"}).Run(context.Background(), k, &bytes.Buffer{}); err == nil || err.Error() != "no memory" {
		t.Errorf("error %v", err)
	}
	if read(t, "a.ipynb") != before {
		t.Error("the notebook was changed")
	}
}

func TestCommandInTheReportCanBeTyped(t *testing.T) {
	j := Job{Notebook: "/home/me/my tank.ipynb", Output: "/home/me/my tank.ipynb", Report: "it's.html", Settings: []string{`Name="x y"`}}
	want := `brinkline run 'my tank.ipynb' --set 'Name="x y"' --report 'it'\''s.html'`
	if got := j.command(); got != want {
		t.Errorf("got %s\nwant %s", got, want)
	}
}
