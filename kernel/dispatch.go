package kernel

import (
	"context"
	"encoding/json"
	"fmt"
	"runtime/debug"
	"strings"
	"time"

	"brinkline/kernel/session"
	"brinkline/kernel/wire"
)

// content is the content of a message to be sent.
type content map[string]any

// A handler serves a request and returns the content of the reply, nil for none.
type handler func(k *kernel, ctx context.Context, request *wire.Message) content

// shellHandlers serve requests in the order in which they came.
var shellHandlers = map[string]handler{
	"execute_request":  (*kernel).execute,
	"history_request":  (*kernel).historyReply,
	"shutdown_request": (*kernel).shutdown,
	"comm_open":        (*kernel).commOpen,
	"comm_msg":         (*kernel).commIgnore,
	"comm_close":       (*kernel).commIgnore,
}

// asideHandlers serve shell requests that need no cell to have ended.
var asideHandlers = map[string]handler{
	"kernel_info_request": (*kernel).info,
	"connect_request":     (*kernel).connect,
	"comm_info_request":   (*kernel).commInfo,
	"complete_request":    (*kernel).complete,
	"is_complete_request": (*kernel).isComplete,
	"inspect_request":     (*kernel).inspect,
}

var controlHandlers = map[string]handler{
	"kernel_info_request": (*kernel).info,
	"connect_request":     (*kernel).connect,
	"interrupt_request":   (*kernel).interruptReply,
	"shutdown_request":    (*kernel).shutdown,
	"usage_request":       (*kernel).usage,
}

// asideAfter is how long a request waits for its turn behind a running cell
// before it is served beside it. Shorter cells keep the order of requests.
const asideAfter = 100 * time.Millisecond

func handlerOf(ch wire.Channel, msgType string) (h handler, aside bool) {
	if ch == wire.Control {
		return controlHandlers[msgType], false
	}
	if h, aside = asideHandlers[msgType]; aside {
		return h, true
	}
	return shellHandlers[msgType], false
}

// receive files a message under its channel.
func (k *kernel) receive(ch wire.Channel, m *wire.Message) {
	if ch == wire.Stdin {
		k.stdin.deliver(m)
		return
	}
	h, aside := handlerOf(ch, m.Header.Type)
	if h == nil {
		k.log.Printf("%s socket: dropped a %s, which this kernel does not know", ch, m.Header.Type)
		return
	}
	j := newJob(ch, m)
	if ch == wire.Control {
		k.control.add(j)
		return
	}
	k.shell.add(j)
	if aside {
		k.aside.add(j)
	}
}

// serve handles the jobs of a queue until it is closed. Those that have not
// waited for long enough are left, for so long, to another queue that they are in.
func (k *kernel) serve(ctx context.Context, q *queue, patience time.Duration) {
	for j := q.next(); j != nil; j = q.next() {
		if patience > 0 {
			select {
			case <-ctx.Done():
			case <-time.After(time.Until(j.arrived.Add(patience))):
			}
		}
		if j.take() {
			k.handle(j)
		}
	}
}

// handle serves one request: busy, what the handler does, reply, idle.
func (k *kernel) handle(j *job) {
	m := j.request
	k.busy(m)
	defer k.idle(m)
	reply := content{"status": "aborted"}
	if !j.aborted.Load() {
		h, _ := handlerOf(j.channel, m.Header.Type)
		if reply = k.guard(h, j.ctx, m); reply == nil {
			return
		}
	}
	k.reply(j.channel, m, reply)
}

// guard calls a handler; a fault of ours becomes an error reply.
func (k *kernel) guard(h handler, ctx context.Context, m *wire.Message) (reply content) {
	defer func() {
		if fault := recover(); fault != nil {
			k.log.Printf("%s failed: %v\n%s", m.Header.Type, fault, debug.Stack())
			reply = failure(&session.Error{Name: "InternalError", Message: fmt.Sprintf("the kernel failed on %s: %v", m.Header.Type, fault)})
		}
	}()
	return h(k, ctx, m)
}

func (k *kernel) reply(ch wire.Channel, request *wire.Message, c content) {
	var metadata any
	if request.Header.Type == "execute_request" {
		metadata = content{"status": c["status"]}
	}
	if err := k.sockets.Reply(ch, request, replyType(request), metadata, c); err != nil {
		k.log.Print(err)
	}
}

func replyType(request *wire.Message) string {
	return strings.TrimSuffix(request.Header.Type, "_request") + "_reply"
}

// publish sends a message to all clients.
func (k *kernel) publish(parent *wire.Message, msgType string, c content) {
	if err := k.sockets.Publish(parent, msgType, nil, c); err != nil {
		k.log.Print(err)
	}
}

// announce says once that the kernel is starting.
func (k *kernel) announce() {
	k.starting.Do(func() { k.publish(nil, "status", content{"execution_state": "starting"}) })
}

// busy opens the answer to a request.
func (k *kernel) busy(m *wire.Message) {
	k.announce()
	k.statusMu.Lock()
	defer k.statusMu.Unlock()
	if m.Header.Type == "execute_request" {
		k.busyWith = m
	}
	k.publish(m, "status", content{"execution_state": "busy"})
}

// idle closes the answer to a request. When a cell is still running, which
// clients that only look at the last status would not see, busy is said again
// for that cell.
func (k *kernel) idle(m *wire.Message) {
	k.statusMu.Lock()
	defer k.statusMu.Unlock()
	if k.busyWith == m {
		k.busyWith = nil
	}
	k.publish(m, "status", content{"execution_state": "idle"})
	if k.busyWith != nil {
		k.publish(k.busyWith, "status", content{"execution_state": "busy"})
	}
}

// read unpacks the content of a request into v. Fields of the wrong kind make
// the request fail with an error that names them.
func read(m *wire.Message, v any) content {
	if err := json.Unmarshal(m.Content, v); err != nil {
		return failure(&session.Error{Name: "RequestError", Message: fmt.Sprintf("%s: %v", m.Header.Type, err)})
	}
	return nil
}

// failure is the content of a reply that tells of an error.
func failure(e *session.Error) content {
	traceback := e.Traceback
	if traceback == nil {
		traceback = []string{e.Name + ": " + e.Message}
	}
	return content{"status": "error", "ename": e.Name, "evalue": e.Message, "traceback": traceback}
}
