package wire

import (
	"fmt"
	"log"
	"net"
	"time"

	"github.com/go-zeromq/zmq4"
)

// Channel names a socket on which requests arrive.
type Channel int

// The channels of requests.
const (
	Shell Channel = iota
	Control
	Stdin
)

// String returns the name of c.
func (c Channel) String() string { return [...]string{"shell", "control", "stdin"}[c] }

// Config says how sockets are opened. The functions are called by the goroutine
// that reads from a peer, for one message after the other; they must not block.
type Config struct {
	// Receive gets each message that is well formed and rightly signed.
	Receive func(Channel, *Message)

	// Subscribed, if not nil, is called after a client of the IOPub socket has
	// been sent its welcome.
	Subscribed func()

	// Log gets a line about each message that is dropped and each peer that is
	// turned away. The default is log.Default().
	Log *log.Logger
}

// Sockets are the five sockets of a kernel. Their methods are safe for
// concurrent use.
type Sockets struct {
	connection *Connection
	config     Config
	codec      *codec
	iopub      *publisher
	heartbeat  *socket
	routers    [3]*socket // by Channel
}

// Open binds the sockets of c; Start lets clients in. Ports that are zero are
// chosen and written back to the connection file.
func Open(c *Connection, config Config) (*Sockets, error) {
	return open(c, config, patience)
}

func open(c *Connection, config Config, t timeouts) (*Sockets, error) {
	sign, err := newSigner(c.SignatureScheme, c.Key)
	if err != nil {
		return nil, err
	}
	if config.Subscribed == nil {
		config.Subscribed = func() {}
	}
	if config.Log == nil {
		config.Log = log.Default()
	}
	listeners, err := bind(c)
	if err != nil {
		return nil, err
	}
	s := &Sockets{connection: c, config: config, codec: newCodec(sign)}
	base := func(name string) *socket {
		return &socket{name: name, listener: listeners[name], patience: t, logf: config.Log.Printf}
	}
	s.iopub = newPublisher(base("iopub"))
	s.iopub.welcome = s.welcome
	s.iopub.subscribed = config.Subscribed
	s.heartbeat = echo(base("heartbeat"))
	for ch := range s.routers {
		s.routers[ch] = s.router(base(Channel(ch).String()), Channel(ch))
	}
	return s, nil
}

// Start begins to accept clients.
func (s *Sockets) Start() {
	for _, x := range s.sockets() {
		x.serve()
	}
}

// bind listens on all ports of c or on none.
func bind(c *Connection) (_ map[string]net.Listener, err error) {
	listeners := make(map[string]net.Listener)
	defer func() {
		if err != nil {
			for _, l := range listeners {
				l.Close()
			}
		}
	}()
	chosen := false
	for _, x := range []struct {
		name string
		port *int
	}{{"shell", &c.Shell}, {"iopub", &c.IOPub}, {"stdin", &c.Stdin}, {"control", &c.Control}, {"heartbeat", &c.Heartbeat}} {
		chosen = chosen || *x.port == 0
		l, err := listen(c, x.name, x.port)
		if err != nil {
			return nil, err
		}
		listeners[x.name] = l
	}
	if chosen {
		err = c.writeBack()
	}
	return listeners, err
}

func (s *Sockets) sockets() []*socket {
	return []*socket{s.heartbeat, s.routers[Shell], s.routers[Control], s.routers[Stdin], s.iopub.socket}
}

// echo makes a heartbeat socket: whatever arrives is sent back.
func echo(s *socket) *socket {
	s.kind = zmq4.Rep
	s.message = func(p *peer, frames [][]byte) { p.offer(frames) }
	return s
}

// router makes a ROUTER socket for the requests of a channel.
func (s *Sockets) router(x *socket, ch Channel) *socket {
	x.kind = zmq4.Router
	x.message = func(p *peer, frames [][]byte) {
		m, err := s.codec.decode(frames)
		if err != nil {
			s.config.Log.Printf("%s socket: dropped a %v", x.name, err)
			return
		}
		m.identity = p.id
		s.config.Receive(ch, m)
	}
	return x
}

// ID returns the identifier of this run of the kernel: the session in the
// headers of its messages.
func (s *Sockets) ID() string { return s.codec.session }

// Connection returns the connection, with the ports that were chosen.
func (s *Sockets) Connection() Connection { return *s.connection }

func (s *Sockets) topic(msgType string) []byte {
	return fmt.Appendf(nil, "kernel.%s.%s", s.ID(), msgType)
}

// welcome answers a subscription. Clients wait for this message to know that
// they will miss nothing.
func (s *Sockets) welcome(p *peer, subscription string) {
	_, frames, err := s.codec.encode("iopub_welcome", nil, nil, map[string]string{"subscription": subscription}, nil)
	if err != nil {
		s.config.Log.Print(err)
		return
	}
	topic := s.topic("iopub_welcome")
	if len(subscription) > len(topic) || string(topic[:len(subscription)]) != subscription {
		topic = []byte(subscription) // or the client would filter it out
	}
	p.offer(append([][]byte{topic}, frames...))
}

// Publish sends a message to all subscribers. The parent is the request that
// caused it, or nil. It does not block.
func (s *Sockets) Publish(parent *Message, msgType string, metadata, content any, buffers ...[]byte) error {
	_, frames, err := s.codec.encode(msgType, parent, metadata, content, buffers)
	if err != nil {
		return err
	}
	s.iopub.publish(append([][]byte{s.topic(msgType)}, frames...))
	return nil
}

// Room waits while messages pile up at a subscriber that is taking them, so
// that a flood of output goes no faster than it is read. It does not wait for
// a subscriber that has stalled, nor when done is closed.
func (s *Sockets) Room(done <-chan struct{}) {
	for s.iopub.crowded() {
		select {
		case <-done:
			return
		case <-time.After(5 * time.Millisecond):
		}
	}
}

// Reply answers a request on the channel that it came from. When its client is
// gone the reply is lost.
func (s *Sockets) Reply(ch Channel, request *Message, msgType string, metadata, content any) error {
	_, err := s.send(ch, request, msgType, metadata, content)
	return err
}

// Ask sends a message on the stdin channel to the client that sent request, and
// returns its msg_id.
func (s *Sockets) Ask(request *Message, msgType string, content any) (id string, err error) {
	return s.send(Stdin, request, msgType, nil, content)
}

func (s *Sockets) send(ch Channel, request *Message, msgType string, metadata, content any) (id string, err error) {
	id, frames, err := s.codec.encode(msgType, request, metadata, content, nil)
	if err != nil {
		return "", err
	}
	p := s.routers[ch].peer(request.identity)
	if p == nil {
		return "", fmt.Errorf("%s: the client is not connected to the %s channel", msgType, ch)
	}
	return id, p.offer(append(append([][]byte{}, request.route...), frames...))
}

// Close lets the peers take what was sent to them, for at most the time given,
// and closes all. Socket files are removed.
func (s *Sockets) Close(linger time.Duration) {
	until := time.Now().Add(linger)
	for _, x := range s.sockets() {
		x.stop()
	}
	for _, x := range s.sockets() {
		x.finish(until)
	}
}
