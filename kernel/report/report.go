// Package report turns an executed notebook into a page for readers: one HTML
// file that needs nothing else. It loads nothing and runs no script, which a
// content policy in the page enforces; it follows the light or dark theme of the
// reader and prints to paper. The same notebook gives the same bytes.
package report

import (
	"crypto/sha256"
	_ "embed"
	"fmt"
	"html/template"
	"io"
	"path/filepath"
	"strings"

	"brinkline/kernel/notebook"
)

// Options says what a page tells beside the notebook.
type Options struct {
	Version  string   // the version of the program that ran the notebook
	Specials []string // a line for each special point found
	Command  string   // what to type to get the page again
}

//go:embed page.gohtml
var pageText string

//go:embed style.css
var style string

var pageTemplate = template.Must(template.New("page").Parse(pageText))

// page is what the template shows.
type page struct {
	Options
	Title       template.HTML // of the notebook; it may hold emphasis or code
	PlainTitle  string
	File        string
	Fingerprint string
	Contents    []heading
	Stopped     *stop
	Parts       []part
	Style       template.CSS
}

// part is one cell: prose, or code with what it put out.
type part struct {
	Prose   template.HTML
	ID      string // of a code cell; "" for prose
	Number  int    // its execution count, 0 when it was not run
	Caption string
	Code    template.HTML
	Folded  bool
	Outputs []template.HTML
	NotRun  bool
}

// stop is the error that ended the run.
type stop struct {
	ID      string
	Number  int
	Message string
}

// HTML writes the page of an executed notebook. When an error had stopped the
// run, the page says so at its top and leaves out the outputs of the cells that
// were not run.
func HTML(w io.Writer, nb *notebook.Notebook, o Options) error {
	p := &page{Options: o, Style: template.CSS(style), File: filepath.Base(nb.Path())}
	p.PlainTitle = strings.TrimSuffix(p.File, filepath.Ext(p.File))
	p.Title = template.HTML(escaped(p.PlainTitle))
	p.Fingerprint = fingerprint(nb)
	prose := newProse(filepath.Dir(nb.Path()))
	for i, cell := range nb.Cells {
		switch cell.Type() {
		case "markdown":
			body, title := prose.cell(cell, i == 0)
			if title.HTML != "" {
				p.Title, p.PlainTitle = title.HTML, title.Text
			}
			p.Parts = append(p.Parts, part{Prose: body})
		case "code":
			p.addCode(cell, i, prose)
		}
	}
	p.Contents = prose.headings
	return pageTemplate.Execute(w, p)
}

func (p *page) addCode(cell *notebook.Cell, index int, prose *prose) {
	if strings.TrimSpace(cell.Source()) == "" && len(cell.Outputs()) == 0 {
		return
	}
	part := part{
		ID: fmt.Sprintf("cell-%d", index+1), Number: cell.Number(), Caption: cell.Caption(),
		Code: highlight(cell.Source()), Folded: cell.Hidden("source"), NotRun: p.Stopped != nil || cell.Number() == 0,
	}
	if p.Stopped == nil && !cell.Hidden("outputs") {
		part.Outputs = outputs(cell.Outputs(), prose)
	}
	if message, failed := failure(cell); failed && p.Stopped == nil {
		p.Stopped = &stop{part.ID, part.Number, message}
	}
	p.Parts = append(p.Parts, part)
}

// failure returns the message of an error that a cell was not meant to give.
func failure(cell *notebook.Cell) (message string, failed bool) {
	if cell.Tagged("raises-exception") {
		return "", false
	}
	for _, o := range cell.Outputs() {
		if o.Type() == "error" {
			_, message, _ := o.Error()
			return message, true
		}
	}
	return "", false
}

// fingerprint identifies the code that a page shows: the start of the SHA-256
// of the sources of its code cells, each followed by a zero byte.
func fingerprint(nb *notebook.Notebook) string {
	sum := sha256.New()
	for _, cell := range nb.Cells {
		if cell.Type() == "code" {
			_, _ = io.WriteString(sum, cell.Source()+"\x00")
		}
	}
	return fmt.Sprintf("%x", sum.Sum(nil)[:8])
}
