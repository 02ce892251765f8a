package notebook

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"brinkline/display"
	"brinkline/kernel/session"
)

func TestAdjacentStreamsOfOneNameAreMerged(t *testing.T) {
	nb := cells(t, "x")
	_ = Run(context.Background(), nb, script{"x": func(out session.Output) session.Result {
		for _, s := range [][2]string{{"stdout", "a"}, {"stdout", ""}, {"stdout", "b\n"}, {"stderr", "e"}, {"stdout", "c\xff\xce"}, {"stdout", "\xbb"}} {
			out.Stream(s[0], s[1])
		}
		return session.Result{}
	}}, nil)
	expect(t, nb, "1: streamstdout(ab\n) streamstderr(e) streamstdout(c\ufffdλ)")
}

func TestDisplayIDsRewriteEarlierOutputsInAnyCell(t *testing.T) {
	nb := cells(t, "show", "update")
	_ = Run(context.Background(), nb, script{
		"show": func(out session.Output) session.Result {
			out.Display(plainText("0 %"), "bar")
			out.Display(plainText("other"), "")
			return session.Result{}
		},
		"update": func(out session.Output) session.Result {
			out.Update(plainText("nobody"), "unknown")
			out.Update(plainText("50 %"), "bar")
			out.Display(plainText("100 %"), "bar")
			return session.Result{}
		},
	}, nil)
	expect(t, nb, "1: display_data(100 %) display_data(other)", "2: display_data(100 %)")
	if strings.Contains(string(nb.Bytes()), "transient") || strings.Contains(string(nb.Bytes()), `"bar"`) {
		t.Errorf("the display id is in the file:\n%s", nb.Bytes())
	}
}

func TestClearOutput(t *testing.T) {
	for _, c := range []struct {
		name string
		do   func(out session.Output)
		want string
	}{
		{"at once", func(out session.Output) { out.Stream("stdout", "a"); out.Clear(false) }, "1:"},
		{"at the next output", func(out session.Output) { out.Stream("stdout", "a"); out.Clear(true); out.Stream("stdout", "b") }, "1: streamstdout(b)"},
		{"at an output that never comes", func(out session.Output) { out.Stream("stdout", "a"); out.Clear(true) }, "1: streamstdout(a)"},
		{"once only", func(out session.Output) {
			out.Clear(true)
			out.Display(plainText("a"), "")
			out.Display(plainText("b"), "")
		}, "1: display_data(a) display_data(b)"},
	} {
		nb := cells(t, "x")
		_ = Run(context.Background(), nb, script{"x": func(out session.Output) session.Result { c.do(out); return session.Result{} }}, nil)
		t.Run(c.name, func(t *testing.T) { expect(t, nb, c.want) })
	}
}

func TestOutputOfAGoroutineThatOutlivesItsCellGoesToThatCell(t *testing.T) {
	var late session.Output
	nb := cells(t, "start", "next")
	_ = Run(context.Background(), nb, script{
		"start": func(out session.Output) session.Result { late = out; return session.Result{} },
		"next":  func(out session.Output) session.Result { late.Stream("stdout", "late"); return session.Result{} },
	}, nil)
	late.Stream("stdout", "too late")
	expect(t, nb, "1: streamstdout(late)", "2:")
}

func TestAFloodIsCutInTheMiddle(t *testing.T) {
	nb := cells(t, "x")
	_ = Run(context.Background(), nb, script{"x": func(out session.Output) session.Result {
		for range 300_000 {
			out.Stream("stdout", "flood\n")
		}
		return session.Result{}
	}}, nil)
	outputs := nb.Cells[0].Outputs()
	_, content := outputs[0].Stream()
	if len(outputs) != 1 || len(content) > 1<<20+100 || !strings.Contains(content, " lines) of output left out ...\n") {
		t.Errorf("%d outputs, the first has %d bytes", len(outputs), len(content))
	}
}

func TestJSONValuesStayRawAndWhatJSONCannotSayIsLeftOut(t *testing.T) {
	nb := cells(t, "x")
	_ = Run(context.Background(), nb, script{"x": func(out session.Output) session.Result {
		out.Display(display.Bundle{Data: map[string]any{
			"application/vnd.x+json": map[string]any{"lines": "a\nb", "n": 1.5},
			"application/json":       math.NaN(),
			"text/plain":             "a\nb",
			"image/png":              "aGFs\nbG8=",
		}, Metadata: map[string]any{"image/png": map[string]any{"alt": "x"}}}, "")
		return session.Result{}
	}}, nil)
	want := map[string]any{
		"output_type": "display_data",
		"data": map[string]any{
			"application/vnd.x+json": map[string]any{"lines": "a\nb", "n": json.Number("1.5")},
			"text/plain":             []any{"a\n", "b"},
			"image/png":              "aGFs\nbG8=",
		},
		"metadata": map[string]any{"image/png": map[string]any{"alt": "x"}},
	}
	if diff := cmp.Diff(want, nb.Cells[0].Outputs()[0].tree); diff != "" {
		t.Error(diff)
	}
}

// A message is one thing that a cell puts out, in the words of the protocol.
type message struct {
	Cell int    `json:"cell"`
	Type string `json:"type"`
	Text string `json:"text"`
	Name string `json:"name"`
	ID   string `json:"id"`
	Wait bool   `json:"wait"`
}

func randomMessages(random *rand.Rand) []message {
	types := []string{"stream", "stream", "display_data", "display_data", "update_display_data", "clear_output", "execute_result", "error"}
	var all []message
	for cell := range 3 {
		for range random.IntN(9) {
			all = append(all, message{
				Cell: cell, Type: types[random.IntN(len(types))], Text: fmt.Sprint(len(all)),
				Name: []string{"stdout", "stderr"}[random.IntN(2)],
				ID:   []string{"", "p", "q"}[random.IntN(3)], Wait: random.IntN(2) == 0,
			})
		}
	}
	return all
}

func play(outs []*cellOutput, m message) {
	out := outs[m.Cell]
	switch m.Type {
	case "stream":
		out.Stream(m.Name, m.Text)
	case "display_data":
		out.Display(plainText(m.Text), m.ID)
	case "update_display_data":
		out.Update(plainText(m.Text), m.ID)
	case "clear_output":
		out.Clear(m.Wait)
	case "execute_result":
		value := plainText(m.Text)
		out.end(session.Result{Value: &value}, m.Cell+1)
	case "error":
		out.end(session.Result{Err: &session.Error{Name: "E", Message: m.Text}}, m.Cell+1)
	}
}

// The reference client gets the same messages through its own code
// (testdata/record.py); the outputs must be the same. It does not merge streams,
// so the script does that afterwards as front ends do.
func TestOutputsAreThoseOfTheReferenceClient(t *testing.T) {
	const python = "/usr/bin/python3"
	if err := exec.Command(python, "-c", "import nbclient").Run(); err != nil {
		if os.Getenv("BRINKLINE_REQUIRE_ALL") == "1" {
			t.Fatalf("nbclient is missing: %v", err)
		}
		t.Skip("nbclient, the reference client, is not installed")
	}
	random := rand.New(rand.NewPCG(1, 2))
	var games [][]message
	var ours [][][]any
	for range 200 {
		messages := randomMessages(random)
		r := newRecord()
		outs := []*cellOutput{{record: r}, {record: r}, {record: r}}
		for _, m := range messages {
			play(outs, m)
		}
		games = append(games, messages)
		ours = append(ours, [][]any{outs[0].snapshot(), outs[1].snapshot(), outs[2].snapshot()})
	}
	input, err := json.Marshal(games)
	if err != nil {
		t.Fatal(err)
	}
	command := exec.Command(python, "testdata/record.py")
	command.Stdin, command.Stderr = strings.NewReader(string(input)), os.Stderr
	reply, err := command.Output()
	if err != nil {
		t.Fatal(err)
	}
	var theirs []json.RawMessage
	if err := json.Unmarshal(reply, &theirs); err != nil || len(theirs) != len(games) {
		t.Fatalf("%d games back: %v", len(theirs), err)
	}
	for i := range games {
		mine, _ := json.Marshal(ours[i])
		var a, b any
		_, _ = json.Unmarshal(mine, &a), json.Unmarshal(theirs[i], &b)
		if diff := cmp.Diff(b, a); diff != "" {
			t.Fatalf("game %d: %+v\n(-reference +ours):\n%s", i, games[i], diff)
		}
	}
}
