// Package notebook reads notebook files of the open nbformat 4 family, runs
// them without a front end, and writes them back so that a diff shows only what
// a run changed.
//
// A notebook is kept as the JSON tree that was read: everything this package
// does not know (metadata, cell types, output types, later minor versions) is
// carried along untouched. Format: nbformat 4.5, as published with the
// reference implementation.
package notebook

import (
	"encoding/json"
	"slices"
	"strconv"
	"strings"
)

// A Notebook is a notebook file in memory.
type Notebook struct {
	Cells []*Cell

	tree      map[string]any
	path      string // where it was read from; "" when it was not
	found     []byte // the bytes as read
	canonical []byte // what those bytes say, in the form that Bytes writes
}

// A Cell is one cell of a notebook.
type Cell struct {
	tree map[string]any
}

// Path returns the file the notebook was read from.
func (nb *Notebook) Path() string { return nb.path }

// Minor returns the minor version of the format; 5 and later have cell ids.
func (nb *Notebook) Minor() int {
	n, _ := integer(nb.tree["nbformat_minor"])
	return n
}

// Metadata returns the notebook's own metadata, to be read only.
func (nb *Notebook) Metadata() map[string]any { return object(nb.tree, "metadata") }

// Changed reports whether the notebook says anything else than the file it was
// read from.
func (nb *Notebook) Changed() bool {
	return nb.found == nil || string(nb.encode()) != string(nb.canonical)
}

// Type returns "code", "markdown", "raw" or a type of a later format.
func (c *Cell) Type() string { return text(c.tree["cell_type"]) }

// ID returns the cell's id, or "" in files older than nbformat 4.5.
func (c *Cell) ID() string { return text(c.tree["id"]) }

// Source returns the text of the cell.
func (c *Cell) Source() string { return joined(c.tree["source"]) }

// Metadata returns the cell's metadata, to be read only.
func (c *Cell) Metadata() map[string]any { return object(c.tree, "metadata") }

// Tagged reports whether the cell has the given tag.
func (c *Cell) Tagged(tag string) bool {
	tags, _ := c.Metadata()["tags"].([]any)
	return slices.ContainsFunc(tags, func(t any) bool { return text(t) == tag })
}

// Hidden reports whether the cell asks front ends to fold away its "source" or
// its "outputs" (metadata.jupyter of nbformat 4.5).
func (c *Cell) Hidden(part string) bool {
	hidden, _ := object(c.Metadata(), "jupyter")[part+"_hidden"].(bool)
	return hidden
}

// Attachment returns the first representation of a file attached to the cell:
// its MIME type and its content, base64 for images.
func (c *Cell) Attachment(name string) (mime, content string, ok bool) {
	bundle := object(object(c.tree, "attachments"), name)
	for _, mime := range sortedKeys(bundle) {
		return mime, joined(bundle[mime]), true
	}
	return "", "", false
}

// Number returns the execution count of a code cell, 0 when it was not run.
func (c *Cell) Number() int {
	n, _ := integer(c.tree["execution_count"])
	return n
}

// Outputs returns the outputs of a code cell.
func (c *Cell) Outputs() []Output {
	list, _ := c.tree["outputs"].([]any)
	outputs := make([]Output, 0, len(list))
	for _, o := range list {
		if tree, ok := o.(map[string]any); ok {
			outputs = append(outputs, Output{tree})
		}
	}
	return outputs
}

// Caption returns one line that tells a reader which cell this is: the comment
// it opens with, or else its first line of code.
func (c *Cell) Caption() string {
	for line := range strings.Lines(c.Source()) {
		line = strings.TrimSpace(line)
		if comment, ok := strings.CutPrefix(line, "//"); ok {
			line = strings.TrimSpace(comment)
		}
		if line != "" {
			return line
		}
	}
	return ""
}

// An Output is one output of a code cell.
type Output struct {
	tree map[string]any
}

// Type returns "stream", "display_data", "execute_result", "error" or a type of
// a later format.
func (o Output) Type() string { return text(o.tree["output_type"]) }

// Stream returns the name ("stdout", "stderr") and the text of a stream.
func (o Output) Stream() (name, content string) {
	return text(o.tree["name"]), joined(o.tree["text"])
}

// Error returns the name, the message and the traceback of an error.
func (o Output) Error() (name, message string, traceback []string) {
	lines, _ := o.tree["traceback"].([]any)
	for _, line := range lines {
		traceback = append(traceback, text(line))
	}
	return text(o.tree["ename"]), text(o.tree["evalue"]), traceback
}

// Data returns a representation of a displayed value, joined to one string. A
// JSON representation is returned as JSON text.
func (o Output) Data(mime string) (string, bool) {
	value, ok := object(o.tree, "data")[mime]
	if !ok {
		return "", false
	}
	if isJSON(mime) {
		return strings.TrimSuffix(string(appendValue(nil, value, 0)), "\n"), true
	}
	return joined(value), true
}

// MIMETypes returns the types of a displayed value's representations, sorted.
func (o Output) MIMETypes() []string {
	return sortedKeys(object(o.tree, "data"))
}

// Metadata returns a text of the output's metadata for one MIME type, for
// instance Metadata("image/png", "alt").
func (o Output) Metadata(mime, key string) string {
	return text(object(object(o.tree, "metadata"), mime)[key])
}

// isJSON reports whether a representation is a JSON value, which is stored as
// it is and not as lines of text.
func isJSON(mime string) bool {
	return mime == "application/json" ||
		strings.HasPrefix(mime, "application/") && strings.HasSuffix(mime, "+json")
}

func text(v any) string {
	s, _ := v.(string)
	return s
}

// joined returns a multi-line string, stored as one string or a list of them.
func joined(v any) string {
	list, ok := v.([]any)
	if !ok {
		return text(v)
	}
	var b strings.Builder
	for _, part := range list {
		b.WriteString(text(part))
	}
	return b.String()
}

// integer reads a whole number of the tree, in which numbers stay as written.
func integer(v any) (int, bool) {
	number, _ := v.(json.Number)
	n, err := strconv.Atoi(string(number))
	return n, err == nil
}

func count(n int) json.Number { return json.Number(strconv.Itoa(n)) }

func object(tree map[string]any, key string) map[string]any {
	m, _ := tree[key].(map[string]any)
	return m
}
