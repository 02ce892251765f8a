package kernel

import (
	"errors"
	"fmt"
	"os"
	"slices"
	"strings"
	"testing"
	"time"

	"brinkline/kernel/internal/protocoltest"
)

func execute(c *protocoltest.Client, code string) (id string) {
	c.T.Helper()
	return c.Send("shell", "execute_request", map[string]any{"code": code})
}

// awaitInput waits until the cell of a request runs.
func awaitInput(c *protocoltest.Client, id string) {
	c.T.Helper()
	for {
		if m := c.Receive("iopub"); m.Type == "execute_input" && m.ParentID() == id {
			return
		}
	}
}

func TestAnInterruptEndsTheCellAndAbortsTheQueue(t *testing.T) {
	c := ready(t)
	loop := execute(c, "out kept\nloop")
	queued := []string{execute(c, "out never"), execute(c, "out never")}
	info := c.Send("shell", "kernel_info_request", struct{}{})
	awaitInput(c, loop)
	if r := c.ReplyTo("shell", info); r.Content["status"] != "ok" {
		t.Errorf("kernel_info beside a running cell: %v", r.Content)
	}
	began := time.Now()
	if r := c.Call("control", "interrupt_request", struct{}{}); r.Type != "interrupt_reply" || r.Content["status"] != "ok" {
		t.Errorf("%s %v", r.Type, r.Content)
	}
	if r := c.ReplyTo("shell", loop); r.Content["status"] != "error" || r.Text("ename") != "Interrupted" {
		t.Errorf("%v", r.Content)
	}
	if d := time.Since(began); d > 200*time.Millisecond {
		t.Errorf("the interrupt took %v", d)
	}
	for _, id := range queued {
		if r := c.ReplyTo("shell", id); r.Type != "execute_reply" || fmt.Sprint(r.Content) != "map[status:aborted]" {
			t.Errorf("%s %v", r.Type, r.Content)
		}
		expect(t, c.UntilIdle(id), "busy", "idle")
	}
	if r, _ := c.Execute("out after"); r.Content["status"] != "ok" || r.Content["execution_count"] != 2.0 {
		t.Errorf("afterwards: %v", r.Content)
	}
}

func TestAnInterruptOfNothingIsHarmless(t *testing.T) {
	c := ready(t)
	for range 3 {
		c.Call("control", "interrupt_request", struct{}{})
		if r, _ := c.Execute("out x"); r.Content["status"] != "ok" {
			t.Errorf("%v", r.Content)
		}
	}
}

// TestAnInterruptIsNeverLost sends it at once after the request: whether the cell
// waits, is about to start or runs, it must not run on.
func TestAnInterruptIsNeverLost(t *testing.T) {
	c := ready(t)
	for range 50 {
		loop := execute(c, "loop")
		for { // the request may arrive after the interrupt
			c.Call("control", "interrupt_request", struct{}{})
			m, err := c.TryReceive("shell", 20*time.Millisecond)
			if err != nil && !errors.Is(err, os.ErrDeadlineExceeded) {
				t.Fatal(err)
			}
			if err == nil {
				if m.ParentID() != loop || m.Content["status"] == "ok" {
					t.Fatalf("%v", m.Content)
				}
				break
			}
		}
	}
}

func TestAfterAFailureWaitingCellsAreAbortedAndNothingElse(t *testing.T) {
	c := ready(t)
	failing := execute(c, "sleep 50ms\nfail x")
	first := execute(c, "out never")
	history := c.Send("shell", "history_request", map[string]any{"hist_access_type": "tail", "n": 5})
	second := execute(c, "out never")
	for _, x := range []struct{ id, status string }{{failing, "error"}, {first, "aborted"}, {history, "ok"}, {second, "aborted"}} {
		if r := c.ReplyTo("shell", x.id); r.Content["status"] != x.status {
			t.Errorf("status %v, want %s", r.Content["status"], x.status)
		}
	}
	if r, _ := c.Execute("value 1"); r.Content["status"] != "ok" {
		t.Errorf("a request sent after the error reply: %v", r.Content)
	}
}

func TestCellsSentTogetherWithAFailingOneAreAborted(t *testing.T) {
	c := ready(t)
	for range 20 {
		failing, next := execute(c, "fail at once"), execute(c, "out never")
		for _, x := range []struct{ id, status string }{{failing, "error"}, {next, "aborted"}} {
			if r := c.ReplyTo("shell", x.id); r.Content["status"] != x.status {
				t.Fatalf("status %v, want %s", r.Content["status"], x.status)
			}
		}
	}
}

func TestWithoutStopOnErrorTheQueueGoesOn(t *testing.T) {
	c := ready(t)
	failing := c.Send("shell", "execute_request", map[string]any{"code": "sleep 20ms\nfail x", "stop_on_error": false})
	next := execute(c, "out x")
	c.ReplyTo("shell", failing)
	if r := c.ReplyTo("shell", next); r.Content["status"] != "ok" {
		t.Errorf("%v", r.Content)
	}
}

func TestRequestsBesideARunningCell(t *testing.T) {
	c := ready(t)
	loop := execute(c, "loop")
	awaitInput(c, loop)
	for msgType, content := range map[string]any{
		"complete_request":    map[string]any{"code": "disp"},
		"inspect_request":     map[string]any{"code": "out"},
		"is_complete_request": map[string]any{"code": "out"},
		"comm_info_request":   struct{}{},
		"connect_request":     struct{}{},
	} {
		id := c.Send("shell", msgType, content)
		if r := c.ReplyTo("shell", id); r.Content["status"] == "error" {
			t.Errorf("%s: %v", msgType, r.Content)
		}
		expect(t, c.UntilIdle(id), "busy", "idle")
		if m := c.Receive("iopub"); m.ParentID() != loop || m.Text("execution_state") != "busy" {
			t.Errorf("after %s: %s %v; want that the cell is busy", msgType, m.Type, m.Content)
		}
	}
	c.Call("control", "interrupt_request", struct{}{})
	c.ReplyTo("shell", loop)
	c.Quiet("shell", 2*asideAfter) // nothing is answered twice
}

func TestShortCellsKeepTheOrderOfRequests(t *testing.T) {
	c := ready(t)
	for range 10 {
		cell := execute(c, "sleep 10ms")
		complete := c.Send("shell", "complete_request", map[string]any{"code": "disp"})
		c.ReplyTo("shell", cell)
		c.ReplyTo("shell", complete)
	}
}

func TestShutdown(t *testing.T) {
	for _, socket := range []string{"control", "shell"} {
		for _, restart := range []bool{false, true} {
			c, end := launch(t)
			c.Receive("iopub") // welcome
			id := c.Send(socket, "shutdown_request", map[string]any{"restart": restart})
			if r := c.ReplyTo(socket, id); r.Content["status"] != "ok" || r.Content["restart"] != restart {
				t.Errorf("%v", r.Content)
			}
			published := c.UntilIdle(id)
			expect(t, published, "busy", "shutdown_reply", "idle")
			if published[1].Content["restart"] != restart {
				t.Errorf("%v", published[1].Content)
			}
			for _, s := range c.Socket {
				s.Close()
			}
			if err := end(); err != nil {
				t.Errorf("Serve returned %v", err)
			}
		}
	}
}

func TestShutdownDuringACell(t *testing.T) {
	for _, code := range []string{"loop", "deaf"} { // one that can be interrupted and one that cannot
		c, end := launch(t)
		c.Receive("iopub") // welcome
		awaitInput(c, execute(c, code))
		began := time.Now()
		c.Call("control", "shutdown_request", map[string]any{"restart": false})
		for _, s := range c.Socket {
			s.Close()
		}
		if err := end(); err != nil {
			t.Errorf("Serve returned %v", err)
		}
		if d := time.Since(began); d > 2400*time.Millisecond {
			t.Errorf("%s: it took %v; clients use force after 2.5s", code, d)
		}
	}
}

func TestALateGoroutinesOutputBelongsToItsCell(t *testing.T) {
	c := ready(t)
	id := execute(c, "late text")
	c.UntilIdle(id)
	other := execute(c, "sleep 10ms")
	c.UntilIdle(other)
	if m := c.Receive("iopub"); m.Type != "stream" || m.Text("text") != "text" || m.ParentID() != id {
		t.Errorf("%s %v of %s", m.Type, m.Content, m.ParentID())
	}
}

func TestAFloodOfTextIsGatheredAndShortened(t *testing.T) {
	c := ready(t)
	id := execute(c, "flood 1000000")
	began := time.Now()
	published := c.UntilIdle(id)
	seconds := time.Since(began).Seconds()
	var all strings.Builder
	for _, m := range published {
		all.WriteString(m.Text("text"))
	}
	got := all.String()
	if n := float64(len(published)); n > 10+25*seconds {
		t.Errorf("%v messages in %.2f s", n, seconds)
	}
	if len(got) > 1<<20+200 || len(got) < 1<<20-200 {
		t.Errorf("%d bytes were published; want 1 MB", len(got))
	}
	if !strings.HasPrefix(got, "line 0\nline 1\n") || !strings.HasSuffix(got, "\nline 999999\n") {
		t.Errorf("head %q, tail %q", got[:20], got[len(got)-20:])
	}
	note := slices.IndexFunc(strings.Split(got, "\n"), func(l string) bool { return strings.Contains(l, "output left out") })
	if note < 0 {
		t.Fatal("nothing says that output is left out")
	}
	var bytes, lines int
	fmt.Sscanf(strings.Split(got, "\n")[note], "... %d bytes (%d lines)", &bytes, &lines)
	printed := 0
	for i := range 1000000 {
		printed += len(fmt.Sprintf("line %d\n", i))
	}
	shown := len(got) - len(fmt.Sprintf("\n... %d bytes (%d lines) of output left out ...\n", bytes, lines))
	if bytes+shown != printed {
		t.Errorf("%d bytes shown and %d left out; %d were printed", shown, bytes, printed)
	}
}

// TestAFloodOfDisplaysLosesNothing: a cell goes no faster than its clients read.
func TestAFloodOfDisplaysLosesNothing(t *testing.T) {
	c := ready(t)
	const n = 5000
	id := execute(c, fmt.Sprintf("displays %d", n))
	time.Sleep(200 * time.Millisecond) // the client is slow
	if published := c.UntilIdle(id); len(published) != n+3 {
		t.Errorf("%d messages, want %d", len(published), n+3)
	}
}

func TestInput(t *testing.T) {
	c := ready(t)
	id := c.Send("shell", "execute_request", map[string]any{"code": "out before\ninput name?", "allow_stdin": true})
	m := c.Receive("stdin")
	if m.Type != "input_request" || m.Text("prompt") != "name?" || m.Content["password"] != false || m.ParentID() != id {
		t.Errorf("%s %v", m.Type, m.Content)
	}
	other := protocoltest.Dial(t, c.Path)
	other.Send("stdin", "input_reply", map[string]any{"value": "of another client"})
	time.Sleep(20 * time.Millisecond)
	c.Send("stdin", "input_reply", map[string]any{"value": "fold"})
	expect(t, c.UntilIdle(id), "busy", "execute_input", "stdout before\n", "execute_result read fold", "idle")
	c.Send("stdin", "input_reply", map[string]any{"value": "stale"}) // nobody waits
	time.Sleep(20 * time.Millisecond)
	id = execute(c, "input again?")
	c.Receive("stdin")
	stale, _ := c.Frames("input_reply", nil, map[string]any{"value": "stale"})
	stale[3] = []byte(`{"msg_id":"another"}`)
	stale[1] = c.Sign(stale[2:6])
	c.SendFrames("stdin", stale)
	c.Send("stdin", "input_reply", map[string]any{"value": "fresh"})
	if got := outline(c.UntilIdle(id)); got[2] != "execute_result read fresh" {
		t.Errorf("%q", got)
	}
}

func TestInputThatIsNotAllowed(t *testing.T) {
	c := ready(t)
	r := c.Call("shell", "execute_request", map[string]any{"code": "input x", "allow_stdin": false})
	if r.Text("ename") != "InputError" {
		t.Errorf("%v", r.Content)
	}
	c.Quiet("stdin", 50*time.Millisecond)
}

func TestAnInterruptCancelsAPendingInput(t *testing.T) {
	c := ready(t)
	id := execute(c, "input x")
	c.Receive("stdin")
	c.Call("control", "interrupt_request", struct{}{})
	if r := c.ReplyTo("shell", id); r.Content["status"] != "error" {
		t.Errorf("%v", r.Content)
	}
}
