package kernel

import (
	"context"
	"encoding/json"
	"fmt"
	"maps"
	"runtime/debug"
	"slices"
	"strings"
	"time"
	"unicode/utf8"

	"brinkline/display"
	"brinkline/kernel/internal/help"
	"brinkline/kernel/session"
	"brinkline/kernel/wire"
)

// executeRequest is the content of an execute_request.
type executeRequest struct {
	Code            string
	Silent          bool
	StoreHistory    *bool             `json:"store_history"`
	UserExpressions map[string]string `json:"user_expressions"`
	AllowStdin      *bool             `json:"allow_stdin"`
	StopOnError     *bool             `json:"stop_on_error"`

	cell string // identity of the cell
}

func orTrue(b *bool) bool { return b == nil || *b }

func readExecute(m *wire.Message) (r executeRequest, bad content) {
	if bad := read(m, &r); bad != nil {
		return r, bad
	}
	var metadata struct {
		CellID string `json:"cellId"`
	}
	_ = json.Unmarshal(m.Metadata, &metadata) // metadata is free: other forms are no error
	r.cell = metadata.CellID
	return r, nil
}

// counts reports whether the cell gets a number of its own and a place in the history.
func (r executeRequest) counts() bool {
	return orTrue(r.StoreHistory) && !r.Silent && strings.TrimSpace(r.Code) != ""
}

// arrival is how long the reply to a failed request is held back, so that
// requests sent together with it arrive and are aborted. A request sent after
// the reply was seen is never caught.
const arrival = 20 * time.Millisecond

// execute runs a cell.
func (k *kernel) execute(ctx context.Context, m *wire.Message) content {
	r, bad := readExecute(m)
	if bad != nil {
		return bad
	}
	number := k.history.count()
	if r.counts() {
		number = k.history.add(r.Code)
	}
	out := newOutput(ctx, k, m, r, number)
	if !r.Silent {
		k.publish(m, "execute_input", content{"code": r.Code, "execution_count": number})
	}
	result, page := k.runOrHelp(ctx, session.Cell{ID: r.cell, Number: number, Source: r.Code}, out)
	reply := content{}
	if result.Err == nil {
		out.result(result.Value)
		reply["status"], reply["user_expressions"] = "ok", k.evaluate(ctx, r)
	} else {
		reply = failure(result.Err)
		out.fail(reply)
		if ctx.Err() != nil || orTrue(r.StopOnError) {
			time.Sleep(arrival)
			k.shell.abort()
		}
	}
	if r.counts() {
		k.history.setOutput(number, plainText(result.Value))
	}
	reply["execution_count"], reply["payload"] = number, page
	return reply
}

// runOrHelp runs a cell or, when it asks for help on a name, returns what the
// front end shows in its pager.
func (k *kernel) runOrHelp(ctx context.Context, c session.Cell, out session.Output) (res session.Result, page []any) {
	name, ok := help.On(c.Source)
	if !ok {
		return k.runCell(ctx, c, out), []any{}
	}
	b, found := k.executor.Inspect(name, utf8.RuneCountInString(name))
	if !found {
		res.Err = &session.Error{Name: "NameError", Message: "nothing is known of " + name}
		return res, []any{}
	}
	return res, []any{content{"source": "page", "data": object(b.Data), "start": 0}}
}

// runCell runs a cell; a fault of the executor becomes an error of the cell.
func (k *kernel) runCell(ctx context.Context, c session.Cell, out session.Output) (res session.Result) {
	defer func() {
		if fault := recover(); fault != nil {
			k.log.Printf("cell %d: the kernel failed: %v\n%s", c.Number, fault, debug.Stack())
			res.Err = &session.Error{Name: "InternalError", Message: fmt.Sprintf("the kernel failed: %v", fault)}
		}
	}()
	return k.executor.Run(ctx, c, out)
}

// evaluate returns the values of the user expressions. Each stands for itself:
// an error in one is told in its place.
func (k *kernel) evaluate(ctx context.Context, r executeRequest) content {
	values := content{}
	for _, name := range slices.Sorted(maps.Keys(r.UserExpressions)) {
		res := k.runCell(ctx, session.Cell{Number: k.history.count(), Source: r.UserExpressions[name]}, discard{})
		switch {
		case res.Err != nil:
			values[name] = failure(res.Err)
		case res.Value == nil:
			values[name] = failure(&session.Error{Name: "ValueError", Message: "the expression has no value"})
		default:
			values[name] = content{"status": "ok", "data": object(res.Value.Data), "metadata": object(res.Value.Metadata)}
		}
	}
	return values
}

func plainText(b *display.Bundle) string {
	if b == nil {
		return ""
	}
	text, _ := b.Data["text/plain"].(string)
	return text
}

// discard is an output that nobody sees.
type discard struct{}

func (discard) Stream(string, string)          {}
func (discard) Display(display.Bundle, string) {}
func (discard) Update(display.Bundle, string)  {}
func (discard) Clear(bool)                     {}
