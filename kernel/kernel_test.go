package kernel

import (
	"context"
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"brinkline/kernel/internal/protocoltest"
)

// launch serves a kernel with a fake executor and returns a client and a
// function that ends the kernel and returns what Serve returned.
func launch(t *testing.T) (c *protocoltest.Client, end func() error) {
	t.Helper()
	path := protocoltest.WriteConnection(t, nil)
	ctx, cancel := context.WithCancel(context.Background())
	ended := make(chan error, 1)
	go func() { ended <- Serve(ctx, path, Options{Executor: new(fake), Log: t.Output()}) }()
	end = func() error {
		cancel()
		select {
		case err := <-ended:
			ended <- err
			return err
		case <-time.After(protocoltest.Patience):
			t.Error("the kernel does not end")
			return nil
		}
	}
	c = protocoltest.Dial(t, path)
	t.Cleanup(func() {
		for _, s := range c.Socket {
			s.Close() // a kernel waits for its clients to hang up
		}
		end()
	})
	return c, end
}

// ready is launch for tests that are not about the start.
func ready(t *testing.T) *protocoltest.Client {
	t.Helper()
	c, _ := launch(t)
	c.Receive("iopub") // welcome
	c.Receive("iopub") // starting
	return c
}

// outline is a line for each message: its type and what is telling in it.
func outline(ms []*protocoltest.Message) (lines []string) {
	for _, m := range ms {
		line := m.Type
		switch m.Type {
		case "status":
			line = m.Text("execution_state")
		case "stream":
			line = m.Text("name") + " " + m.Text("text")
		case "error":
			line += " " + m.Text("ename")
		case "execute_result", "display_data", "update_display_data":
			line += fmt.Sprint(" ", m.Content["data"].(map[string]any)["text/plain"])
		case "clear_output":
			line += fmt.Sprint(" ", m.Content["wait"])
		}
		lines = append(lines, line)
	}
	return lines
}

func expect(t *testing.T, ms []*protocoltest.Message, want ...string) {
	t.Helper()
	if got := outline(ms); !slices.Equal(got, want) {
		t.Errorf("published\n %q, want\n %q", got, want)
	}
}

func TestStartingComesOnceAfterTheFirstWelcome(t *testing.T) {
	c, _ := launch(t)
	if m := c.Receive("iopub"); m.Type != "iopub_welcome" {
		t.Errorf("first is %s %v", m.Type, m.Content)
	}
	if m := c.Receive("iopub"); m.Type != "status" || m.Text("execution_state") != "starting" || len(m.Parent) != 0 {
		t.Errorf("second is %s %v", m.Type, m.Content)
	}
	c.Subscribe("kernel")
	if m := c.Receive("iopub"); m.Type != "iopub_welcome" {
		t.Errorf("third is %s %v", m.Type, m.Content)
	}
	c.Quiet("iopub", 50*time.Millisecond)
}

func TestKernelInfo(t *testing.T) {
	c := ready(t)
	for _, socket := range []string{"shell", "control"} {
		id := c.Send(socket, "kernel_info_request", struct{}{})
		m := c.ReplyTo(socket, id)
		info := m.Content
		if m.Type != "kernel_info_reply" || info["status"] != "ok" || info["protocol_version"] != "5.5" || info["implementation"] != "brinkline" {
			t.Errorf("%s: %s %v", socket, m.Type, info)
		}
		language, _ := info["language_info"].(map[string]any)
		for _, key := range []string{"name", "version", "mimetype", "file_extension", "pygments_lexer", "codemirror_mode"} {
			if s, _ := language[key].(string); s == "" {
				t.Errorf("language_info %v lacks %s", language, key)
			}
		}
		if _, ok := info["supported_features"].([]any); !ok || info["help_links"] == nil || info["banner"] == "" {
			t.Errorf("%v lacks fields", info)
		}
		expect(t, c.UntilIdle(id), "busy", "idle")
	}
}

func TestWhatACellPublishesAndInWhichOrder(t *testing.T) {
	for _, x := range []struct {
		code string
		want []string
	}{
		{"out hello", []string{"stdout hello\n"}},
		{"out a\nerr b\nout c", []string{"stdout a\n", "stderr b\n", "stdout c\n"}},
		{"out a\nout b", []string{"stdout a\nb\n"}},
		{"value 42", []string{"execute_result 42"}},
		{"out before\nvalue 42", []string{"stdout before\n", "execute_result 42"}},
		{"out before\nfail badly", []string{"stdout before\n", "error Failure"}},
		{"out a\ndisplay d one\nout b\nupdate d two\nclear wait\nout c",
			[]string{"stdout a\n", "display_data one", "stdout b\n", "update_display_data two", "clear_output true", "stdout c\n"}},
		{"nan", []string{"execute_result not a number"}},
		{"panic oops", []string{"error InternalError"}},
	} {
		t.Run(x.code, func(t *testing.T) {
			_, published := ready(t).Execute(x.code)
			expect(t, published, append(append([]string{"busy", "execute_input"}, x.want...), "idle")...)
		})
	}
}

func TestReplies(t *testing.T) {
	c := ready(t)
	ok, published := c.Execute("display d x\nvalue 42")
	if ok.Type != "execute_reply" || ok.Content["status"] != "ok" || ok.Content["execution_count"] != 1.0 || ok.Metadata["status"] != "ok" {
		t.Errorf("reply %+v", ok)
	}
	if input := published[1]; input.Text("code") != "display d x\nvalue 42" || input.Content["execution_count"] != 1.0 {
		t.Errorf("execute_input %v", input.Content)
	}
	if transient := published[2].Content["transient"]; fmt.Sprint(transient) != "map[display_id:d]" {
		t.Errorf("transient %v", transient)
	}
	if result := published[3].Content; result["execution_count"] != 1.0 || fmt.Sprint(result["metadata"]) != "map[]" {
		t.Errorf("execute_result %v", result)
	}
	bad, published := c.Execute("fail badly")
	for _, m := range []*protocoltest.Message{bad, published[2]} {
		if m.Text("ename") != "Failure" || m.Text("evalue") != "badly" || fmt.Sprint(m.Content["traceback"]) != "[Failure: badly]" {
			t.Errorf("%s %v", m.Type, m.Content)
		}
	}
	if bad.Content["status"] != "error" || bad.Content["execution_count"] != 2.0 {
		t.Errorf("reply %v", bad.Content)
	}
}

func TestTheCellsIdentityReachesTheSession(t *testing.T) {
	c := ready(t)
	frames, id := c.Frames("execute_request", map[string]any{"cellId": "c-7"}, map[string]any{"code": "cell"})
	c.SendFrames("shell", frames)
	expect(t, c.UntilIdle(id), "busy", "execute_input", `execute_result cell "c-7" number 1`, "idle")
	frames, id = c.Frames("execute_request", map[string]any{"cellId": 7}, map[string]any{"code": "cell"})
	c.SendFrames("shell", frames)
	expect(t, c.UntilIdle(id), "busy", "execute_input", `execute_result cell "" number 2`, "idle")
}

func TestCounterAndHistory(t *testing.T) {
	c := ready(t)
	for _, x := range []struct {
		content   map[string]any
		count     float64
		published []string
	}{
		{map[string]any{"code": "value 1"}, 1, []string{"execute_input", "execute_result 1"}},
		{map[string]any{"code": "value 2", "store_history": false}, 1, []string{"execute_input", "execute_result 2"}},
		{map[string]any{"code": "out x\nvalue 3", "silent": true}, 1, nil},
		{map[string]any{"code": "fail x", "silent": true, "store_history": true}, 1, nil},
		{map[string]any{"code": " \n"}, 1, []string{"execute_input"}},
		{map[string]any{"code": "out y"}, 2, []string{"execute_input", "stdout y\n"}},
	} {
		id := c.Send("shell", "execute_request", x.content)
		if r := c.ReplyTo("shell", id); r.Content["execution_count"] != x.count {
			t.Errorf("%v: count %v, want %v", x.content, r.Content["execution_count"], x.count)
		}
		expect(t, c.UntilIdle(id), append(append([]string{"busy"}, x.published...), "idle")...)
	}
	for _, code := range []string{"out y", "sleep 1ms"} {
		c.Execute(code)
	}
	for _, x := range []struct{ request, want string }{
		{"tail 2", "[[1 3 out y] [1 4 sleep 1ms]]"},
		{"tail 99", "[[1 1 value 1] [1 2 out y] [1 3 out y] [1 4 sleep 1ms]]"},
		{"output", "[[1 1 [value 1 1]] [1 2 [out y <nil>]]]"},
		{"range 0 2 4", "[[1 2 out y] [1 3 out y]]"},
		{"range 1 0 99", "[[1 1 value 1] [1 2 out y] [1 3 out y] [1 4 sleep 1ms]]"},
		{"range -1 0 99", "[]"},
		{"search out*", "[[1 2 out y] [1 3 out y]]"},
		{"unique out*", "[[1 3 out y]]"},
		{"search ?????*", "[[1 1 value 1] [1 2 out y] [1 3 out y] [1 4 sleep 1ms]]"},
		{"search [a-z]*", "[]"},
		{"last out*", "[[1 3 out y]]"},
	} {
		r := c.Call("shell", "history_request", historyContent(x.request))
		if got := fmt.Sprint(r.Content["history"]); got != x.want || r.Content["status"] != "ok" {
			t.Errorf("history %s: %s, want %s", x.request, got, x.want)
		}
	}
}

// historyContent spells out a history request.
func historyContent(short string) map[string]any {
	kind, rest, _ := strings.Cut(short, " ")
	c := map[string]any{"output": false, "raw": true, "hist_access_type": kind}
	switch kind {
	case "tail":
		var n int
		fmt.Sscan(rest, &n)
		c["n"] = n
	case "output":
		c["hist_access_type"], c["output"], c["session"], c["start"], c["stop"] = "range", true, 0, 1, 3
	case "range":
		var session, start, stop int
		fmt.Sscan(rest, &session, &start, &stop)
		c["session"], c["start"], c["stop"] = session, start, stop
	default:
		c["hist_access_type"], c["pattern"], c["unique"] = "search", rest, kind == "unique"
		if kind == "last" {
			c["n"] = 1
		}
	}
	return c
}

func TestUserExpressions(t *testing.T) {
	c := ready(t)
	r := c.Call("shell", "execute_request", map[string]any{
		"code": "out x", "user_expressions": map[string]string{"good": "value 5", "bad": "fail x", "none": "out y"},
	})
	values := r.Content["user_expressions"].(map[string]any)
	for name, want := range map[string]string{"good": "ok", "bad": "error", "none": "error"} {
		if got := values[name].(map[string]any)["status"]; got != want {
			t.Errorf("%s: status %v, want %s", name, got, want)
		}
	}
	if r.Content["status"] != "ok" || fmt.Sprint(values["good"].(map[string]any)["data"]) != "map[text/plain:5]" {
		t.Errorf("reply %v", r.Content)
	}
}

func TestPositionsAreCodePoints(t *testing.T) {
	c := ready(t)
	code := "out \U0001F600λ disp and more" // one emoji, two UTF-16 units, four bytes
	r := c.Call("shell", "complete_request", map[string]any{"code": code, "cursor_pos": 11})
	if got := fmt.Sprint(r.Content["matches"], r.Content["cursor_start"], r.Content["cursor_end"]); got != "[display displays] 7 11" {
		t.Errorf("completion %s", got)
	}
	if r.Content["status"] != "ok" || r.Content["metadata"] == nil {
		t.Errorf("reply %v", r.Content)
	}
	for _, cursor := range []any{99, -5, nil} { // outside of the code
		r := c.Call("shell", "complete_request", map[string]any{"code": "zzz", "cursor_pos": cursor})
		if m, ok := r.Content["matches"].([]any); r.Content["status"] != "ok" || !ok || cursor != -5 && len(m) != 0 {
			t.Errorf("cursor %v: %v", cursor, r.Content)
		}
	}
}

func TestIsComplete(t *testing.T) {
	c := ready(t)
	for code, want := range map[string]string{
		"out x":    "map[status:complete]",
		"out x \\": "map[indent:     status:incomplete]",
		"?":        "map[status:invalid]",
	} {
		if r := c.Call("shell", "is_complete_request", map[string]any{"code": code}); fmt.Sprint(r.Content) != want {
			t.Errorf("%q: %v, want %s", code, r.Content, want)
		}
	}
}

func TestInspect(t *testing.T) {
	c := ready(t)
	r := c.Call("shell", "inspect_request", map[string]any{"code": "out", "cursor_pos": 2, "detail_level": 0})
	if r.Content["found"] != true || fmt.Sprint(r.Content["data"]) != "map[text/plain:verb out, cursor at 2]" {
		t.Errorf("%v", r.Content)
	}
	r = c.Call("shell", "inspect_request", map[string]any{"code": "nothing", "cursor_pos": 2})
	if r.Content["found"] != false || r.Content["status"] != "ok" || fmt.Sprint(r.Content["data"], r.Content["metadata"]) != "map[] map[]" {
		t.Errorf("%v", r.Content)
	}
}

func TestComms(t *testing.T) {
	c := ready(t)
	if r := c.Call("shell", "comm_info_request", struct{}{}); fmt.Sprint(r.Content) != "map[comms:map[] status:ok]" {
		t.Errorf("comm_info %v", r.Content)
	}
	id := c.Send("shell", "comm_open", map[string]any{"comm_id": "c1", "target_name": "unknown", "data": struct{}{}})
	published := c.UntilIdle(id)
	expect(t, published, "busy", "comm_close", "idle")
	if got := published[1].Content["comm_id"]; got != "c1" {
		t.Errorf("comm_close of %v", got)
	}
	for _, msgType := range []string{"comm_msg", "comm_close"} {
		id := c.Send("shell", msgType, map[string]any{"comm_id": "c1", "data": struct{}{}})
		expect(t, c.UntilIdle(id), "busy", "idle")
	}
}

func TestConnect(t *testing.T) {
	r := ready(t).Call("shell", "connect_request", struct{}{})
	for _, port := range []string{"shell_port", "iopub_port", "stdin_port", "control_port", "hb_port"} {
		if n, _ := r.Content[port].(float64); n < 1 {
			t.Errorf("%s is %v", port, r.Content[port])
		}
	}
}

func TestUsage(t *testing.T) {
	c := ready(t)
	c.Call("control", "usage_request", struct{}{})
	r := c.Call("control", "usage_request", struct{}{})
	if memory, _ := r.Content["kernel_memory"].(float64); memory < 1<<20 || memory > 1<<34 {
		t.Errorf("kernel_memory %v", r.Content["kernel_memory"])
	}
	if cpu, ok := r.Content["kernel_cpu"].(float64); !ok || cpu < 0 {
		t.Errorf("kernel_cpu %v", r.Content["kernel_cpu"])
	}
}

func TestRequestsOfAnotherForm(t *testing.T) {
	c := ready(t)
	for msgType, content := range map[string]any{
		"execute_request":     map[string]any{"code": 5},
		"complete_request":    map[string]any{"code": "x", "cursor_pos": "end"},
		"inspect_request":     map[string]any{"code": []int{}},
		"is_complete_request": map[string]any{"code": struct{}{}},
		"history_request":     map[string]any{"n": "all"},
	} {
		r := c.Call("shell", msgType, content)
		if r.Content["status"] != "error" || !strings.Contains(r.Text("evalue"), msgType) {
			t.Errorf("%s: %v", msgType, r.Content)
		}
	}
	c.Send("shell", "request_of_the_future", struct{}{})
	id := c.Send("shell", "execute_request", map[string]any{"code": "out x", "option_of_the_future": []int{1}})
	if r := c.ReplyTo("shell", id); r.Content["status"] != "ok" {
		t.Errorf("%v", r.Content)
	}
}

func TestHelpGoesToThePager(t *testing.T) {
	c := ready(t)
	for _, code := range []string{"?out", "out?", " out? \n"} {
		r, published := c.Execute(code)
		if got := fmt.Sprint(r.Content["payload"]); got != "[map[data:map[text/plain:verb out, cursor at 3] source:page start:0]]" {
			t.Errorf("%q: payload %s", code, got)
		}
		expect(t, published, "busy", "execute_input", "idle")
	}
	if r, _ := c.Execute("nothing?"); r.Text("evalue") != "nothing is known of nothing" {
		t.Errorf("%v", r.Content)
	}
}
