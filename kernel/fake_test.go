package kernel

import (
	"context"
	"fmt"
	"math"
	"os"
	"strconv"
	"strings"
	"testing"
	"time"

	"brinkline/display"
	"brinkline/kernel/session"
)

// When this names a connection file, the test binary is a kernel whose cells
// are in the language of fake.
const fakeKernel = "BRINKLINE_TEST_CONNECTION"

func TestMain(m *testing.M) {
	if path := os.Getenv(fakeKernel); path != "" {
		if err := Serve(context.Background(), path, Options{Executor: new(fake)}); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		os.Exit(0)
	}
	os.Exit(m.Run())
}

// fake is an executor whose cells are lines of a verb and its arguments.
type fake struct{}

// verbs return the value of a line, if it has one.
var verbs = map[string]func(ctx context.Context, arg string, out session.Output) (*display.Bundle, *session.Error){
	"out": func(_ context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		out.Stream("stdout", arg+"\n")
		return nil, nil
	},
	"err": func(_ context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		out.Stream("stderr", arg+"\n")
		return nil, nil
	},
	"value": func(_ context.Context, arg string, _ session.Output) (*display.Bundle, *session.Error) {
		return text(arg), nil
	},
	"nan": func(context.Context, string, session.Output) (*display.Bundle, *session.Error) {
		b := text("not a number")
		b.Data["application/json"] = map[string]any{"x": math.NaN(), "y": []float64{1, math.Inf(1)}}
		return b, nil
	},
	"fail": func(_ context.Context, arg string, _ session.Output) (*display.Bundle, *session.Error) {
		return nil, &session.Error{Name: "Failure", Message: arg}
	},
	"panic": func(_ context.Context, arg string, _ session.Output) (*display.Bundle, *session.Error) { panic(arg) },
	"loop": func(ctx context.Context, _ string, out session.Output) (*display.Bundle, *session.Error) {
		<-ctx.Done()
		return nil, &session.Error{Name: "Interrupted", Message: "interrupted", Interrupted: true}
	},
	"deaf": func(context.Context, string, session.Output) (*display.Bundle, *session.Error) { select {} },
	"sleep": func(ctx context.Context, arg string, _ session.Output) (*display.Bundle, *session.Error) {
		d, _ := time.ParseDuration(arg)
		time.Sleep(d)
		return nil, nil
	},
	"display": func(_ context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		id, t, _ := strings.Cut(arg, " ")
		out.Display(*text(t), id)
		return nil, nil
	},
	"update": func(_ context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		id, t, _ := strings.Cut(arg, " ")
		out.Update(*text(t), id)
		return nil, nil
	},
	"clear": func(_ context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		out.Clear(arg == "wait")
		return nil, nil
	},
	"flood": func(ctx context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		n, _ := strconv.Atoi(arg)
		for i := range n {
			out.Stream("stdout", fmt.Sprintf("line %d\n", i))
		}
		return nil, nil
	},
	"displays": func(ctx context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		n, _ := strconv.Atoi(arg)
		for i := 0; i < n && ctx.Err() == nil; i++ {
			out.Display(*text(strings.Repeat("x", 1000)), "")
		}
		return nil, nil
	},
	"late": func(_ context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		time.AfterFunc(200*time.Millisecond, func() { out.Stream("stdout", arg) })
		return nil, nil
	},
	"input": func(ctx context.Context, arg string, out session.Output) (*display.Bundle, *session.Error) {
		line, err := out.(interface {
			Input(context.Context, string, bool) (string, error)
		}).Input(ctx, arg, false)
		if err != nil {
			return nil, &session.Error{Name: "InputError", Message: err.Error(), Interrupted: ctx.Err() != nil}
		}
		return text("read " + line), nil
	},
	"cell": func(context.Context, string, session.Output) (*display.Bundle, *session.Error) { return nil, nil }, // see Run
}

func text(s string) *display.Bundle { return &display.Bundle{Data: map[string]any{"text/plain": s}} }

func (*fake) Run(ctx context.Context, c session.Cell, out session.Output) (res session.Result) {
	for _, line := range strings.Split(c.Source, "\n") {
		verb, arg, _ := strings.Cut(line, " ")
		switch f := verbs[verb]; {
		case verb == "":
		case verb == "cell":
			res.Value = text(fmt.Sprintf("cell %q number %d", c.ID, c.Number))
		case f == nil:
			return session.Result{Err: &session.Error{Name: "SyntaxError", Message: "no verb " + verb}}
		default:
			if res.Value, res.Err = f(ctx, arg, out); res.Err != nil {
				return res
			}
		}
	}
	return res
}

func (*fake) Complete(source string, cursor int) session.Completion {
	runes := []rune(source)[:cursor]
	start := len(runes)
	for start > 0 && runes[start-1] != ' ' && runes[start-1] != '\n' {
		start--
	}
	c := session.Completion{Start: start, End: cursor}
	for _, verb := range []string{"display", "displays"} {
		if strings.HasPrefix(verb, string(runes[start:])) {
			c.Matches = append(c.Matches, verb)
		}
	}
	return c
}

func (*fake) IsComplete(source string) (status, indent string) {
	switch {
	case strings.HasSuffix(source, "\\"):
		return "incomplete", "    "
	case strings.HasPrefix(source, "?"):
		return "invalid", ""
	}
	return "complete", ""
}

func (*fake) Inspect(source string, cursor int) (display.Bundle, bool) {
	if verbs[strings.TrimSpace(source)] == nil {
		return display.Bundle{}, false
	}
	return *text(fmt.Sprintf("verb %s, cursor at %d", source, cursor)), true
}

func (*fake) Close() {}
