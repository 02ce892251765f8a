// Package protocoltest is a client of a kernel for tests. It signs, frames and
// reads messages by itself, so that a mistake in the kernel's own code does not
// cancel out. Every message that it receives is checked for its form.
package protocoltest

import (
	"crypto/hmac"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"net"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"github.com/go-zeromq/zmq4"
	"github.com/go-zeromq/zmq4/security/null"
)

// Key signs the messages of the kernels that WriteConnection describes.
const Key = "an invented key"

// Patience is how long a client waits for a message that must come.
const Patience = 5 * time.Second

// WriteConnection writes a connection file with ports of 0, to be chosen by the
// kernel, and returns its path. Fields replace or extend the usual ones.
func WriteConnection(t testing.TB, fields map[string]any) string {
	t.Helper()
	all := map[string]any{
		"transport": "tcp", "ip": "127.0.0.1", "key": Key, "signature_scheme": "hmac-sha256",
		"shell_port": 0, "iopub_port": 0, "stdin_port": 0, "control_port": 0, "hb_port": 0,
	}
	for k, v := range fields {
		all[k] = v
	}
	text, err := json.Marshal(all)
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(t.TempDir(), "connection.json")
	if err := os.WriteFile(path, text, 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

// Message is a message that a client received.
type Message struct {
	Topic    string // of messages from the IOPub socket
	Type     string
	Header   map[string]any
	Parent   map[string]any
	Metadata map[string]any
	Content  map[string]any
	Buffers  [][]byte
}

// ParentID returns the msg_id of the request that the message answers.
func (m *Message) ParentID() string {
	id, _ := m.Parent["msg_id"].(string)
	return id
}

// Text returns a string of the content.
func (m *Message) Text(key string) string {
	s, _ := m.Content[key].(string)
	return s
}

// Client is a client of one kernel. One goroutine may use it.
type Client struct {
	T       testing.TB
	Session string
	Path    string             // of the connection file
	Socket  map[string]*Socket // shell, control, stdin, iopub, hb
	key     []byte
}

// Socket is one connection of a client.
type Socket struct {
	*zmq4.Conn
	Raw net.Conn

	pump   sync.Once
	next   chan received // one message ahead of what was asked for
	close  sync.Once
	closed chan struct{}
}

// Close ends the connection.
func (s *Socket) Close() (err error) {
	s.close.Do(func() {
		close(s.closed)
		err = s.Conn.Close()
	})
	return err
}

type received struct {
	msg zmq4.Msg
	err error
}

// start lets a goroutine read: a deadline on the connection could cut a message.
func (s *Socket) start() {
	go func() {
		for {
			msg, err := s.RecvMsg()
			select {
			case s.next <- received{msg, err}:
			case <-s.closed:
				return
			}
			if err != nil {
				return
			}
		}
	}()
}

var clients atomic.Int64

// Dial connects all sockets to the kernel of a connection file, once that names
// its ports, and subscribes to all of IOPub.
func Dial(t testing.TB, path string) *Client {
	t.Helper()
	c := &Client{T: t, Path: path, Session: fmt.Sprintf("client-%d", clients.Add(1)), Socket: make(map[string]*Socket)}
	fields := connection(t, path)
	c.key = []byte(fields["key"].(string))
	for name, kind := range map[string]zmq4.SocketType{
		"shell": zmq4.Dealer, "control": zmq4.Dealer, "stdin": zmq4.Dealer, "iopub": zmq4.Sub, "hb": zmq4.Req,
	} {
		s, err := Open(Address(fields, name), kind, c.Session)
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		t.Cleanup(func() { s.Close() })
		c.Socket[name] = s
	}
	c.Subscribe("")
	return c
}

// connection reads a connection file whose ports are chosen.
func connection(t testing.TB, path string) (fields map[string]any) {
	t.Helper()
	for until := time.Now().Add(Patience); time.Now().Before(until); time.Sleep(2 * time.Millisecond) {
		text, err := os.ReadFile(path)
		if err != nil || json.Unmarshal(text, &fields) != nil || fields["hb_port"] == 0.0 {
			continue
		}
		return fields
	}
	t.Fatalf("no ports in %s after %v", path, Patience)
	return nil
}

// Address returns the network and the address of a socket.
func Address(fields map[string]any, socket string) [2]string {
	ip, port := fields["ip"].(string), fmt.Sprint(fields[socket+"_port"])
	if fields["transport"] == "ipc" {
		return [2]string{"unix", ip + "-" + port}
	}
	return [2]string{"tcp", net.JoinHostPort(ip, port)}
}

// Open connects to an address and completes the ZeroMQ handshake.
func Open(address [2]string, kind zmq4.SocketType, identity string) (*Socket, error) {
	raw, err := net.Dial(address[0], address[1])
	if err != nil {
		return nil, err
	}
	conn, err := zmq4.Open(raw, null.Security(), kind, zmq4.SocketIdentity(identity), false, nil)
	if err != nil {
		raw.Close()
		return nil, err
	}
	return &Socket{Conn: conn, Raw: raw, next: make(chan received, 1), closed: make(chan struct{})}, nil
}

// Subscribe asks for the messages whose topics begin with topic.
func (c *Client) Subscribe(topic string) {
	c.T.Helper()
	if err := c.Socket["iopub"].SendMsg(zmq4.NewMsg(append([]byte{1}, topic...))); err != nil {
		c.T.Fatal(err)
	}
}

var ids atomic.Int64

// Frames returns a signed request and its msg_id. Metadata may be nil.
func (c *Client) Frames(msgType string, metadata, content any) (frames [][]byte, id string) {
	c.T.Helper()
	id = fmt.Sprintf("%s-%d", c.Session, ids.Add(1))
	if metadata == nil {
		metadata = struct{}{}
	}
	header := map[string]any{
		"msg_id": id, "session": c.Session, "username": "tester", "version": "5.5", "msg_type": msgType,
		"date": time.Now().UTC().Format(time.RFC3339Nano),
	}
	var parts [][]byte
	for _, v := range []any{header, struct{}{}, metadata, content} {
		p, err := json.Marshal(v)
		if err != nil {
			c.T.Fatal(err)
		}
		parts = append(parts, p)
	}
	return append([][]byte{[]byte("<IDS|MSG>"), c.Sign(parts)}, parts...), id
}

// Sign returns the HMAC-SHA256 of parts in hexadecimal digits.
func (c *Client) Sign(parts [][]byte) []byte {
	if len(c.key) == 0 {
		return nil
	}
	mac := hmac.New(sha256.New, c.key)
	for _, p := range parts {
		mac.Write(p)
	}
	return []byte(hex.EncodeToString(mac.Sum(nil)))
}

// Send sends a request and returns its msg_id.
func (c *Client) Send(socket, msgType string, content any) (id string) {
	c.T.Helper()
	frames, id := c.Frames(msgType, nil, content)
	c.SendFrames(socket, frames)
	return id
}

// SendFrames sends a message as it is.
func (c *Client) SendFrames(socket string, frames [][]byte) {
	c.T.Helper()
	if err := c.Socket[socket].SendMsg(zmq4.NewMsgFrom(frames...)); err != nil {
		c.T.Fatal(err)
	}
}

// Receive returns the next message from a socket, which must come.
func (c *Client) Receive(socket string) *Message {
	c.T.Helper()
	m, err := c.TryReceive(socket, Patience)
	if err != nil {
		c.T.Fatalf("%s: %v", socket, err)
	}
	return m
}

// Quiet fails the test if a message comes from a socket within d.
func (c *Client) Quiet(socket string, d time.Duration) {
	c.T.Helper()
	m, err := c.TryReceive(socket, d)
	if err == nil {
		c.T.Errorf("%s: unexpected %s %v", socket, m.Type, m.Content)
	} else if !errors.Is(err, os.ErrDeadlineExceeded) {
		c.T.Errorf("%s: %v", socket, err)
	}
}

// TryReceive waits for a message for at most d.
func (c *Client) TryReceive(socket string, d time.Duration) (*Message, error) {
	c.T.Helper()
	s := c.Socket[socket]
	s.pump.Do(s.start)
	select {
	case r := <-s.next:
		if r.err != nil {
			return nil, r.err
		}
		return c.parse(socket, r.msg.Frames)
	case <-time.After(d):
		return nil, os.ErrDeadlineExceeded
	}
}

// parse checks the form of a message and reads it.
func (c *Client) parse(socket string, frames [][]byte) (*Message, error) {
	m := new(Message)
	if socket == "iopub" {
		m.Topic, frames = string(frames[0]), frames[1:]
	}
	if len(frames) < 6 || string(frames[0]) != "<IDS|MSG>" {
		return nil, fmt.Errorf("frames %q are no message", frames)
	}
	if want := c.Sign(frames[2:6]); string(want) != string(frames[1]) {
		return nil, fmt.Errorf("signature %s, want %s", frames[1], want)
	}
	for i, v := range []*map[string]any{&m.Header, &m.Parent, &m.Metadata, &m.Content} {
		if err := json.Unmarshal(frames[2+i], v); err != nil || *v == nil {
			return nil, fmt.Errorf("part %d is %q: %v", i, frames[2+i], err)
		}
	}
	m.Type, _ = m.Header["msg_type"].(string)
	m.Buffers = frames[6:]
	return m, m.check(socket)
}

// check holds a message to the rules for all messages.
func (m *Message) check(socket string) error {
	for _, key := range []string{"msg_id", "session", "username", "date", "msg_type", "version"} {
		if s, _ := m.Header[key].(string); s == "" {
			return fmt.Errorf("header %v lacks %s", m.Header, key)
		}
	}
	if m.Header["version"] != "5.5" {
		return fmt.Errorf("protocol version %v, want 5.5", m.Header["version"])
	}
	if _, err := time.Parse(time.RFC3339Nano, m.Header["date"].(string)); err != nil {
		return fmt.Errorf("date: %v", err)
	}
	if socket == "iopub" && !strings.HasSuffix(m.Topic, "."+m.Type) && m.Type != "iopub_welcome" {
		return fmt.Errorf("topic %q of a %s", m.Topic, m.Type)
	}
	return nil
}

// UntilIdle returns the IOPub messages that answer a request, from busy to idle.
func (c *Client) UntilIdle(id string) (ms []*Message) {
	c.T.Helper()
	for {
		m := c.Receive("iopub")
		if m.ParentID() != id {
			continue
		}
		ms = append(ms, m)
		if m.Type == "status" && m.Text("execution_state") == "idle" {
			return ms
		}
	}
}

// Call sends a request to a socket and returns its reply.
func (c *Client) Call(socket, msgType string, content any) *Message {
	c.T.Helper()
	return c.ReplyTo(socket, c.Send(socket, msgType, content))
}

// ReplyTo returns the next message on a socket, which must answer the request id.
func (c *Client) ReplyTo(socket, id string) *Message {
	c.T.Helper()
	m := c.Receive(socket)
	if m.ParentID() != id {
		c.T.Fatalf("a %s to %s came; one to %s is awaited", m.Type, m.ParentID(), id)
	}
	return m
}

// Execute runs a cell and returns its reply and what it published.
func (c *Client) Execute(code string) (reply *Message, published []*Message) {
	c.T.Helper()
	id := c.Send("shell", "execute_request", map[string]any{"code": code})
	reply = c.ReplyTo("shell", id)
	return reply, c.UntilIdle(id)
}
