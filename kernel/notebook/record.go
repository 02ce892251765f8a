package notebook

import (
	"bytes"
	"encoding/json"
	"strings"
	"sync"
	"unicode/utf8"

	"brinkline/display"
	"brinkline/kernel/internal/flood"
	"brinkline/kernel/session"
)

// A record collects what cells put out, by the rules by which front ends turn a
// kernel's messages into outputs. It is shared by all cells of a run, because a
// display id may stand in several of them.
type record struct {
	mu     sync.Mutex
	shown  map[string][]map[string]any // display id -> the outputs that carry it
	closed bool
}

// cellOutput is where one cell's output goes. It lives on after its cell, so
// that a goroutine that outlives the cell still writes to the right one.
type cellOutput struct {
	*record
	outputs []map[string]any
	pending bool // clear before the next output
	limit   flood.Limit
}

var _ session.Output = (*cellOutput)(nil)

func newRecord() *record { return &record{shown: map[string][]map[string]any{}} }

// close stops the recording: what comes later is dropped.
func (r *record) close() {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.closed = true
}

// Stream adds to the stream that the cell wrote last, or begins another.
func (o *cellOutput) Stream(name, content string) {
	o.mu.Lock()
	defer o.mu.Unlock()
	o.print(name, o.limit.Write(name, content))
}

func (o *cellOutput) print(name, content string) {
	if content == "" {
		return
	}
	o.add("", func() map[string]any {
		if n := len(o.outputs); n > 0 {
			last := o.outputs[n-1]
			if last["output_type"] == "stream" && last["name"] == name {
				last["text"].(*strings.Builder).WriteString(content)
				return nil
			}
		}
		text := &strings.Builder{} // a cell may print one byte at a time
		text.WriteString(content)
		return map[string]any{"output_type": "stream", "name": name, "text": text}
	})
}

// Display adds an output. Outputs of the same display id, in any cell, are
// brought up to date with it.
func (o *cellOutput) Display(b display.Bundle, id string) {
	o.mu.Lock()
	defer o.mu.Unlock()
	o.add(id, func() map[string]any {
		o.update(b, id)
		return displayed("display_data", b)
	})
}

// Update changes all outputs of a display id; an unknown id changes nothing.
func (o *cellOutput) Update(b display.Bundle, id string) {
	o.mu.Lock()
	defer o.mu.Unlock()
	if !o.closed {
		o.update(b, id)
	}
}

// Clear removes the cell's outputs, now or when the next one comes.
func (o *cellOutput) Clear(wait bool) {
	o.mu.Lock()
	defer o.mu.Unlock()
	switch {
	case o.closed:
	case wait:
		o.pending = true
	default:
		o.clear()
	}
}

// end closes the output of a cell that was run: with the value of its last
// expression, or with the error that stopped it.
func (o *cellOutput) end(r session.Result, number int) {
	o.mu.Lock()
	defer o.mu.Unlock()
	o.limit.End(o.print)
	switch {
	case r.Err != nil:
		o.add("", func() map[string]any { return failed(r.Err) })
	case r.Value != nil:
		o.add("", func() map[string]any {
			out := displayed("execute_result", *r.Value)
			out["execution_count"] = count(number)
			return out
		})
	}
}

func failed(err *session.Error) map[string]any {
	traceback := []any{}
	for _, line := range err.Traceback {
		traceback = append(traceback, line)
	}
	if len(traceback) == 0 {
		traceback = append(traceback, err.Name+": "+err.Message)
	}
	return map[string]any{"output_type": "error", "ename": err.Name, "evalue": err.Message, "traceback": traceback}
}

// add appends the output that build makes; nil stands for none.
func (o *cellOutput) add(id string, build func() map[string]any) {
	if o.closed {
		return
	}
	if o.pending {
		o.clear()
	}
	out := build()
	if out == nil {
		return
	}
	o.outputs = append(o.outputs, out)
	if id != "" {
		o.shown[id] = append(o.shown[id], out)
	}
}

func (o *cellOutput) update(b display.Bundle, id string) {
	for _, out := range o.shown[id] {
		fresh := displayed("display_data", b)
		out["data"], out["metadata"] = fresh["data"], fresh["metadata"]
	}
}

// clear empties the cell. A cleared output is no longer in the notebook: that
// its display id still points to it does no harm.
func (o *cellOutput) clear() {
	o.outputs, o.pending = nil, false
}

// snapshot returns the outputs as they are stored in a file.
func (o *cellOutput) snapshot() []any {
	o.mu.Lock()
	defer o.mu.Unlock()
	list := make([]any, len(o.outputs))
	for i, out := range o.outputs {
		list[i] = stored(out)
	}
	return list
}

// displayed returns a bundle as an output, in plain JSON values.
func displayed(kind string, b display.Bundle) map[string]any {
	return map[string]any{"output_type": kind, "data": plain(b.Data), "metadata": plain(b.Metadata)}
}

// plain turns Go values into a JSON tree. A value that JSON can't express is
// left out, and the others stay.
func plain(values map[string]any) map[string]any {
	tree := map[string]any{}
	for key, value := range values {
		content, err := json.Marshal(value)
		if err != nil {
			continue
		}
		decoder := json.NewDecoder(bytes.NewReader(content))
		decoder.UseNumber()
		var v any
		if decoder.Decode(&v) == nil {
			tree[key] = v
		}
	}
	return tree
}

// stored returns an output in the form of files: texts as lists of lines.
func stored(out map[string]any) map[string]any {
	copied := make(map[string]any, len(out))
	for key, value := range out {
		copied[key] = value
	}
	if text, ok := out["text"].(*strings.Builder); ok {
		copied["text"] = lines(strings.ToValidUTF8(text.String(), string(utf8.RuneError))) // once: a cell may print half a character
	}
	if data, ok := out["data"].(map[string]any); ok {
		split := make(map[string]any, len(data))
		for mime, value := range data {
			if s, ok := value.(string); ok && isText(mime) {
				value = lines(s)
			}
			split[mime] = value
		}
		copied["data"] = split
	}
	return copied
}

// isText reports whether a representation is stored as a list of lines.
func isText(mime string) bool {
	return strings.HasPrefix(mime, "text/") || mime == "image/svg+xml" || mime == "application/javascript"
}
