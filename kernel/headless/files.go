package headless

import (
	"bytes"
	"errors"
	"fmt"
	"path/filepath"
	"strings"

	"brinkline/kernel/notebook"
	"brinkline/kernel/report"
)

// write writes the results of a run. That one can't be written does not keep
// the other from being written.
func (j Job) write(nb *notebook.Notebook, o report.Options, p *progress) error {
	notebookErr := j.writeNotebook(nb, p)
	if j.Report == "" {
		return notebookErr
	}
	var page bytes.Buffer
	if err := report.HTML(&page, nb, o); err != nil {
		return errors.Join(notebookErr, err)
	}
	written, err := notebook.WriteFile(j.Report, page.Bytes())
	if err == nil {
		p.wrote(j.Report, written)
	}
	return errors.Join(notebookErr, err)
}

// writeNotebook writes the executed notebook, beside the place it was meant for
// when somebody saved the notebook while it ran: their work is not overwritten.
func (j Job) writeNotebook(nb *notebook.Notebook, p *progress) error {
	place, edited := j.Output, samePlace(j.Output, j.Notebook) && nb.EditedSince()
	if edited {
		extension := filepath.Ext(place)
		place = strings.TrimSuffix(place, extension) + "-executed" + extension
	}
	written, err := nb.Write(place)
	if err != nil {
		return err
	}
	p.wrote(place, written)
	if edited {
		return fmt.Errorf("%s was saved by somebody else during the run and is left as it is; the executed notebook is %s", j.Output, place)
	}
	return nil
}
