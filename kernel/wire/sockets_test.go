package wire

import (
	"bytes"
	"io"
	"log"
	"net"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/go-zeromq/zmq4"
	"go.uber.org/goleak"

	"brinkline/kernel/internal/protocoltest"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// host is a set of open sockets with what they received and logged.
type host struct {
	*Sockets
	path     string
	received chan *Message
	log      *logbook
}

// logbook is a log that a test can read.
type logbook struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (l *logbook) Write(p []byte) (int, error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.b.Write(p)
}

func (l *logbook) String() string {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.b.String()
}

// await waits until the log holds text.
func (l *logbook) await(t *testing.T, text string) {
	t.Helper()
	for until := time.Now().Add(protocoltest.Patience); time.Now().Before(until); time.Sleep(time.Millisecond) {
		if strings.Contains(l.String(), text) {
			return
		}
	}
	t.Errorf("no %q in the log:\n%s", text, l)
}

func start(t *testing.T, fields map[string]any, p timeouts) *host {
	t.Helper()
	h := &host{path: protocoltest.WriteConnection(t, fields), received: make(chan *Message, 100), log: new(logbook)}
	c, err := ReadConnection(h.path)
	if err != nil {
		t.Fatal(err)
	}
	h.Sockets, err = open(c, Config{
		Receive: func(_ Channel, m *Message) { h.received <- m },
		Log:     log.New(h.log, "", 0),
	}, p)
	if err != nil {
		t.Fatal(err)
	}
	h.Start()
	t.Cleanup(func() { h.Close(0) })
	return h
}

func (h *host) receive(t *testing.T) *Message {
	t.Helper()
	select {
	case m := <-h.received:
		return m
	case <-time.After(protocoltest.Patience):
		t.Fatalf("nothing was received; log:\n%s", h.log)
		return nil
	}
}

var usual = timeouts{handshake: 2 * time.Second, write: 5 * time.Second}

func TestRequestAndReply(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	for i, socket := range []string{"shell", "control"} {
		id := c.Send(socket, "some_request", map[string]any{"text": "<a & b>"})
		m := h.receive(t)
		if m.Header.ID != id || m.Header.Type != "some_request" || string(m.Content) != `{"text":"\u003ca \u0026 b\u003e"}` {
			t.Errorf("received %+v", m)
		}
		if err := h.Reply(Channel(i), m, "some_reply", nil, map[string]string{"text": "<a & b>"}); err != nil {
			t.Fatal(err)
		}
		if r := c.ReplyTo(socket, id); r.Type != "some_reply" || r.Text("text") != "<a & b>" || r.Header["session"] != h.ID() {
			t.Errorf("reply %+v", r)
		}
	}
}

func TestParentHeaderIsTheRequestsHeaderByteForByte(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	frames, id := c.Frames("some_request", nil, struct{}{})
	frames[2] = []byte(strings.Replace(string(frames[2]), "{", "{ \"future\": 1.50,  ", 1))
	frames[1] = c.Sign(frames[2:6])
	c.SendFrames("shell", frames)
	m := h.receive(t)
	if m.Header.ID != id || !bytes.Equal(m.RawHeader, frames[2]) {
		t.Fatalf("header %s, want %s", m.RawHeader, frames[2])
	}
	if err := h.Reply(Shell, m, "some_reply", nil, nil); err != nil {
		t.Fatal(err)
	}
	msg, err := c.Socket["shell"].RecvMsg()
	if err != nil || !bytes.Equal(msg.Frames[3], frames[2]) {
		t.Errorf("parent header %s, want %s", msg.Frames[3], frames[2])
	}
}

func TestBuffersAndFurtherIdentitiesAreCarried(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	frames, _ := c.Frames("comm_msg", nil, struct{}{})
	frames = append([][]byte{[]byte("behind")}, append(frames, []byte{0, 1}, nil)...)
	c.SendFrames("shell", frames)
	m := h.receive(t)
	if len(m.Buffers) != 2 || !bytes.Equal(m.Buffers[0], []byte{0, 1}) || len(m.Buffers[1]) != 0 {
		t.Errorf("buffers %q", m.Buffers)
	}
	if err := h.Reply(Shell, m, "r", nil, nil); err != nil {
		t.Fatal(err)
	}
	if msg, err := c.Socket["shell"].RecvMsg(); err != nil || string(msg.Frames[0]) != "behind" {
		t.Errorf("frames %q, %v: want the identity first", msg.Frames, err)
	}
}

func TestWhatIsNotAMessageIsLoggedAndDropped(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	for _, x := range []struct {
		what, log string
		spoil     func(f [][]byte) [][]byte
	}{
		{"wrong signature", "wrong signature", func(f [][]byte) [][]byte { f[1] = bytes.Repeat([]byte("0"), 64); return f }},
		{"no signature", "wrong signature", func(f [][]byte) [][]byte { f[1] = nil; return f }},
		{"changed content", "wrong signature", func(f [][]byte) [][]byte { f[5] = []byte(`{"a":1}`); return f }},
		{"too short", "too short", func(f [][]byte) [][]byte { return f[:5] }},
		{"no delimiter", "too short", func(f [][]byte) [][]byte { return f[1:] }},
		{"nothing", "too short", func([][]byte) [][]byte { return [][]byte{nil} }},
		{"header no JSON", "header is not a JSON object", func(f [][]byte) [][]byte { f[2] = []byte("{"); f[1] = c.Sign(f[2:6]); return f }},
		{"content a list", "content is not a JSON object", func(f [][]byte) [][]byte { f[5] = []byte("[1]"); f[1] = c.Sign(f[2:6]); return f }},
		{"content empty", "content is not a JSON object", func(f [][]byte) [][]byte { f[5] = nil; f[1] = c.Sign(f[2:6]); return f }},
		{"header without type", "without msg_type", func(f [][]byte) [][]byte { f[2] = []byte("{}"); f[1] = c.Sign(f[2:6]); return f }},
		{"header of other kind", "broken header", func(f [][]byte) [][]byte { f[2] = []byte(`{"msg_id":[]}`); f[1] = c.Sign(f[2:6]); return f }},
	} {
		t.Run(x.what, func(t *testing.T) {
			frames, _ := c.Frames("some_request", nil, struct{}{})
			c.SendFrames("shell", x.spoil(frames))
			h.log.await(t, x.log)
			id := c.Send("shell", "good_request", struct{}{})
			if m := h.receive(t); m.Header.ID != id {
				t.Errorf("received %s %s", m.Header.Type, m.Content)
			}
		})
	}
}

func TestARepeatedSignatureIsRefused(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	frames, _ := c.Frames("some_request", nil, struct{}{})
	c.SendFrames("shell", frames)
	h.receive(t)
	c.SendFrames("control", frames)
	h.log.await(t, "a signature that was used before")
	if len(h.received) != 0 {
		t.Error("the repeated message was taken")
	}
}

func TestWithoutAKeyNothingIsSigned(t *testing.T) {
	h := start(t, map[string]any{"key": ""}, usual)
	c := protocoltest.Dial(t, h.path)
	id := c.Send("shell", "some_request", struct{}{})
	m := h.receive(t)
	h.Reply(Shell, m, "some_reply", nil, nil)
	if r := c.ReplyTo("shell", id); r.Type != "some_reply" {
		t.Errorf("%+v", r)
	}
}

func TestEverySubscriptionIsWelcomed(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path) // subscribes to ""
	for _, topic := range []string{"", "kernel.", "something else"} {
		if topic != "" {
			c.Subscribe(topic)
		}
		m := c.Receive("iopub")
		if m.Type != "iopub_welcome" || m.Content["subscription"] != topic || len(m.Parent) != 0 || !strings.HasPrefix(m.Topic, topic) {
			t.Errorf("subscription to %q: %+v", topic, m)
		}
	}
}

func TestOnlySubscribedTopicsAreSent(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	c.Receive("iopub")
	c.Socket["iopub"].SendMsg(zmq4.NewMsg([]byte{0})) // cancels ""
	c.Subscribe("kernel." + h.ID() + ".stream")
	c.Receive("iopub")
	for _, msgType := range []string{"status", "stream", "error"} {
		h.Publish(nil, msgType, nil, map[string]string{"name": msgType})
	}
	if m := c.Receive("iopub"); m.Type != "stream" || m.Topic != "kernel."+h.ID()+".stream" {
		t.Errorf("%+v", m)
	}
	c.Quiet("iopub", 50*time.Millisecond)
}

func TestHeartbeatEchoes(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	for range 2 {
		if err := c.Socket["hb"].SendMsg(zmq4.NewMsgFrom(nil, []byte("ping"))); err != nil {
			t.Fatal(err)
		}
		msg, err := c.Socket["hb"].RecvMsg()
		if err != nil || len(msg.Frames) != 2 || string(msg.Frames[1]) != "ping" {
			t.Errorf("echo %q, %v", msg.Frames, err)
		}
	}
}

func TestPingIsAnsweredWithItsContext(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	if err := c.Socket["shell"].SendCmd(zmq4.CmdPing, []byte("\x00\x0acontext")); err != nil {
		t.Fatal(err)
	}
	cmd, err := c.Socket["shell"].RecvCmd()
	if err != nil || cmd.Name != zmq4.CmdPong || string(cmd.Body) != "context" {
		t.Errorf("%+v, %v", cmd, err)
	}
}

func TestASilentConnectionIsTurnedAwayAndBlocksNobody(t *testing.T) {
	h := start(t, nil, timeouts{handshake: 100 * time.Millisecond, write: time.Second})
	silent, err := net.Dial("tcp", addressOf(h, "shell"))
	if err != nil {
		t.Fatal(err)
	}
	defer silent.Close()
	began := time.Now()
	c := protocoltest.Dial(t, h.path)
	c.Send("shell", "some_request", struct{}{})
	h.receive(t)
	if d := time.Since(began); d > time.Second {
		t.Errorf("others waited %v", d)
	}
	silent.SetReadDeadline(time.Now().Add(protocoltest.Patience))
	if _, err := io.Copy(io.Discard, silent); err != nil {
		t.Errorf("the connection was not closed: %v", err)
	}
	h.log.await(t, "turned away")
}

func addressOf(h *host, socket string) string {
	c := h.Connection()
	fields := map[string]any{"ip": c.IP, "shell_port": c.Shell, "iopub_port": c.IOPub}
	return protocoltest.Address(fields, socket)[1]
}

func TestAConnectionThatSpeaksSomethingElseIsTurnedAway(t *testing.T) {
	h := start(t, nil, usual)
	for _, text := range []string{
		"GET / HTTP/1.1\r\nHost: localhost\r\n\r\n" + strings.Repeat(" ", 64),
		greeting + "\x04\x06\x05READY\xff",                             // a command that ends early
		greeting + "\x04\x0a\x05READY\xff\x00\x00\x00",                 // a property longer than its command
		greeting + "\x06\x7f\xff\xff\xff\xff\xff\xff\xff\x05READY\x00", // a command of 2^63-1 bytes
	} {
		c, err := net.Dial("tcp", addressOf(h, "shell"))
		if err != nil {
			t.Fatal(err)
		}
		io.WriteString(c, text)
		c.SetReadDeadline(time.Now().Add(protocoltest.Patience))
		io.Copy(io.Discard, c)
		c.Close()
	}
	h.log.await(t, "turned away")
	protocoltest.Dial(t, h.path)
}

// greeting is that of a ZMTP 3.0 peer with the NULL mechanism.
var greeting = "\xff\x00\x00\x00\x00\x00\x00\x00\x01\x7f\x03\x00NULL" + strings.Repeat("\x00", 16+32)

func TestALyingFrameLengthCostsNothing(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	c.Socket["shell"].Raw.Write([]byte("\x02\x00\x00\x00\x00\x3f\xff\xff\xffabc")) // 2^30-1 bytes follow, it says
	c.Socket["control"].Raw.Write([]byte("\x02\x7f\xff\xff\xff\xff\xff\xff\xff"))
	if _, err := c.TryReceive("control", protocoltest.Patience); err == nil || os.IsTimeout(err) {
		t.Errorf("a frame of 2^63-1 bytes: %v; want the connection closed", err)
	}
	protocoltest.Dial(t, h.path).Send("shell", "some_request", struct{}{})
	h.receive(t)
}

func TestAStalledSubscriberHoldsUpNobodyAndIsDropped(t *testing.T) {
	h := start(t, nil, timeouts{handshake: time.Second, write: time.Second})
	stalled, c := protocoltest.Dial(t, h.path), protocoltest.Dial(t, h.path)
	stalled.Receive("iopub")
	c.Receive("iopub")
	const messages, size = 1000, 1 << 14 // more than the buffers of a connection hold
	began := time.Now()
	go func() {
		text := strings.Repeat("x", size)
		for range messages {
			h.Room(nil)
			h.Publish(nil, "stream", nil, map[string]string{"text": text})
		}
	}()
	for i := range messages {
		if m := c.Receive("iopub"); len(m.Text("text")) != size {
			t.Fatalf("message %d: %d bytes", i, len(m.Text("text")))
		}
	}
	if d := time.Since(began); d > 10*time.Second {
		t.Errorf("the other subscriber got its %d messages in %v", messages, d)
	}
	h.log.await(t, "does not take its messages")
}

func TestAStalledClientBlocksNoReply(t *testing.T) {
	h := start(t, nil, usual)
	stalled, c := protocoltest.Dial(t, h.path), protocoltest.Dial(t, h.path)
	stalled.Send("shell", "some_request", struct{}{})
	from := h.receive(t)
	for range 100 {
		h.Reply(Shell, from, "some_reply", nil, map[string]string{"text": strings.Repeat("x", 1<<18)})
	}
	id := c.Send("shell", "some_request", struct{}{})
	h.Reply(Shell, h.receive(t), "some_reply", nil, nil)
	c.ReplyTo("shell", id)
}

func TestRoomWaitsForASlowSubscriberUntilItIsDone(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	c.Receive("iopub")
	p := h.iopub.all()[0]
	p.mu.Lock()
	p.bytes += 2 * crowdedBytes // as if they were queued
	p.mu.Unlock()
	done := make(chan struct{})
	time.AfterFunc(50*time.Millisecond, func() { close(done) })
	began := time.Now()
	h.Room(done)
	if d := time.Since(began); d < 40*time.Millisecond || d > 2*time.Second {
		t.Errorf("Room returned after %v; want 50ms", d)
	}
}

func TestAClientThatConnectsAnewTakesItsOwnPlace(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	id := c.Send("shell", "some_request", struct{}{})
	m := h.receive(t)
	again, err := protocoltest.Open([2]string{"tcp", addressOf(h, "shell")}, zmq4.Dealer, c.Session)
	if err != nil {
		t.Fatal(err)
	}
	defer again.Close()
	c.TryReceive("shell", protocoltest.Patience) // until the old connection is closed
	c.Socket["shell"] = again
	if err := h.Reply(Shell, m, "some_reply", nil, nil); err != nil {
		t.Fatal(err)
	}
	c.ReplyTo("shell", id)
}

func TestTheLastMessagesArriveBeforeTheEnd(t *testing.T) {
	h := start(t, nil, usual)
	c := protocoltest.Dial(t, h.path)
	c.Receive("iopub")
	c.Send("control", "shutdown_request", struct{}{})
	m := h.receive(t)
	const n = 500
	for i := range n {
		h.Publish(nil, "stream", nil, map[string]any{"text": strings.Repeat("y", 1000), "i": i})
	}
	h.Reply(Control, m, "shutdown_reply", nil, nil)
	go h.Close(5 * time.Second)
	for i := range n {
		if m := c.Receive("iopub"); m.Content["i"] != float64(i) {
			t.Fatalf("message %d is %v", i, m.Content["i"])
		}
	}
	c.ReplyTo("control", m.Header.ID)
	for _, s := range c.Socket {
		s.Close()
	}
}

func TestSocketFiles(t *testing.T) {
	dir := t.TempDir()
	stem := filepath.Join(dir, "k")
	stale, err := net.Listen("unix", stem+"-3")
	if err != nil {
		t.Fatal(err)
	}
	stale.(*net.UnixListener).SetUnlinkOnClose(false)
	stale.Close() // leaves a file on which nobody listens
	h := start(t, map[string]any{"transport": "ipc", "ip": stem, "shell_port": 3}, usual)
	files, _ := filepath.Glob(stem + "-*")
	if len(files) != 5 {
		t.Errorf("files %v; want 5", files)
	}
	for _, f := range files {
		if info, err := os.Stat(f); err != nil || info.Mode().Perm()&0o077 != 0 {
			t.Errorf("%s is open to others: %v", f, info.Mode())
		}
	}
	c := protocoltest.Dial(t, h.path)
	c.Send("shell", "some_request", struct{}{})
	h.receive(t)
	h.Close(0)
	if files, _ := filepath.Glob(stem + "-*"); len(files) != 0 {
		t.Errorf("files %v are left", files)
	}
}
