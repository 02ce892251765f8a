// Package headless runs a notebook without a front end: a notebook file in, the
// executed notebook, its report and a line for each cell out.
package headless

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"brinkline/kernel/notebook"
	"brinkline/kernel/report"
)

// A Job says what to run and where the results go.
type Job struct {
	Notebook string   // the notebook file
	Output   string   // where the executed notebook goes; "" means back into Notebook
	Report   string   // where the report goes; "" means that none is wanted
	Settings []string // assignments that override the cell tagged "parameters"
}

// An Executor runs cells and knows what they found; *session.Session is one.
type Executor interface {
	notebook.Executor
	Specials() []string // a line for each special point, in the order found
	Close()
}

// A Kernel is what runs the cells of a job and what it says of itself.
type Kernel struct {
	Start    func() (Executor, error)
	Language map[string]any // the notebook's language_info
	Version  string         // for the report
}

// Run runs a job and tells what it does on w. When a cell fails, it writes what
// exists up to there and returns a *notebook.CellError. Nothing is run when the
// notebook can't be read or the results could not be written.
func (j Job) Run(ctx context.Context, k Kernel, w io.Writer) error {
	if j.Output == "" {
		j.Output = j.Notebook
	}
	nb, err := notebook.Read(j.Notebook)
	if err != nil {
		return err
	}
	if err := errors.Join(j.checkPlaces(), nb.SetParameters(j.Settings)); err != nil {
		return err
	}
	progress := &progress{w: w}
	specials, runErr := j.execute(ctx, nb, k, progress)
	var cellError *notebook.CellError
	if runErr != nil && !errors.As(runErr, &cellError) {
		return runErr
	}
	nb.SetLanguage(k.Language)
	progress.specials(specials)
	options := report.Options{Version: k.Version, Specials: specials, Command: j.command()}
	return errors.Join(runErr, j.write(nb, options, progress))
}

// execute runs the cells in the notebook's folder, as front ends do for their
// kernels, so that cells find the files beside the notebook.
func (j Job) execute(ctx context.Context, nb *notebook.Notebook, k Kernel, p *progress) ([]string, error) {
	back, err := os.Getwd()
	if err != nil {
		return nil, err
	}
	if err := os.Chdir(filepath.Dir(j.Notebook)); err != nil {
		return nil, err
	}
	defer func() { _ = os.Chdir(back) }()
	executor, err := k.Start()
	if err != nil {
		return nil, err
	}
	defer executor.Close()
	err = notebook.Run(ctx, nb, executor, p.step)
	return executor.Specials(), err
}

// command is what a reader of the report types to get it again. It names files
// without their folders, which are different on the reader's machine.
func (j Job) command() string {
	words := []string{"brinkline", "run", filepath.Base(j.Notebook)}
	for _, s := range j.Settings {
		words = append(words, "--set", s)
	}
	if j.Output != j.Notebook {
		words = append(words, "-o", filepath.Base(j.Output))
	}
	words = append(words, "--report", filepath.Base(j.Report))
	for i, word := range words {
		words[i] = quoted(word)
	}
	return strings.Join(words, " ")
}

// quoted protects a word from the shell where that is needed.
func quoted(word string) string {
	if strings.ContainsFunc(word, func(r rune) bool { return !strings.ContainsRune(plainRunes, r) }) || word == "" {
		return "'" + strings.ReplaceAll(word, "'", `'\''`) + "'"
	}
	return word
}

const plainRunes = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-_=+.,:/@%"

// checkPlaces refuses places for the results that can't be written or that
// would destroy one another.
func (j Job) checkPlaces() error {
	if err := notebook.CheckWritable(j.Output); err != nil {
		return err
	}
	if j.Report == "" {
		return nil
	}
	for _, other := range []string{j.Notebook, j.Output} {
		if samePlace(j.Report, other) {
			return fmt.Errorf("the report would overwrite the notebook %s; give it another name", other)
		}
	}
	return notebook.CheckWritable(j.Report)
}

func samePlace(a, b string) bool {
	if filepath.Clean(a) == filepath.Clean(b) {
		return true
	}
	infoA, errA := os.Stat(a)
	infoB, errB := os.Stat(b)
	return errA == nil && errB == nil && os.SameFile(infoA, infoB)
}
