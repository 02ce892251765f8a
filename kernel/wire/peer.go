package wire

import (
	"errors"
	"fmt"
	"sync"
	"time"

	"github.com/go-zeromq/zmq4"
)

// A peer's queue holds at most this much; a peer that lets it fill is dropped.
const (
	maxQueued      = 1 << 14 // messages
	maxQueuedBytes = 1 << 28
)

// Above this much a queue is called crowded, and who can wait should.
const (
	crowded      = 1 << 10 // messages
	crowdedBytes = 1 << 24
)

// timeouts are the patience of the sockets.
type timeouts struct {
	handshake time.Duration // for a peer to complete the handshake
	write     time.Duration // for a peer to take anything of what it is sent
}

var patience = timeouts{handshake: 2 * time.Second, write: 30 * time.Second}

var errOverrun = errors.New("too much is queued")

// parcel is what a writer sends in one go: a message, or a command if name is set.
type parcel struct {
	frames [][]byte
	name   string
}

func (p parcel) size() int {
	n := 0
	for _, f := range p.frames {
		n += len(f)
	}
	return n
}

// peer is a link with a queue and the goroutine that writes it out.
type peer struct {
	*link
	id string // identity, made up when the peer has none

	mu     sync.Mutex
	wake   *sync.Cond // signalled when queue, ending or err changes
	queue  []parcel
	bytes  int  // in queue
	ending bool // no more is queued; the writer stops when the queue is empty
	err    error
}

func newPeer(l *link) *peer {
	p := &peer{link: l, id: l.identity()}
	p.wake = sync.NewCond(&p.mu)
	return p
}

// offer queues a message and never blocks. It drops the peer when the queue is full.
func (p *peer) offer(frames [][]byte) error { return p.put(parcel{frames: frames}) }

func (p *peer) put(x parcel) error {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.err != nil || p.ending {
		return p.err
	}
	if len(p.queue) >= maxQueued || p.bytes >= maxQueuedBytes {
		p.fail(errOverrun)
		return p.err
	}
	p.queue = append(p.queue, x)
	p.bytes += x.size()
	p.wake.Broadcast()
	return nil
}

// fail closes the connection; p.mu is held.
func (p *peer) fail(err error) {
	if p.err == nil {
		p.err = err
		p.queue, p.bytes = nil, 0
		p.raw.Close()
		p.wake.Broadcast()
	}
}

// drop ends the peer at once.
func (p *peer) drop(err error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.fail(err)
}

// crowded reports whether messages pile up at a peer that is taking them.
func (p *peer) crowded() bool {
	p.mu.Lock()
	defer p.mu.Unlock()
	return (len(p.queue) > crowded || p.bytes > crowdedBytes) && p.raw.stuckFor() < time.Second
}

// next waits for a parcel. It returns false when there will be none any more.
func (p *peer) next() (x parcel, last, ok bool) {
	p.mu.Lock()
	defer p.mu.Unlock()
	for len(p.queue) == 0 && !p.ending && p.err == nil {
		p.wake.Wait()
	}
	if len(p.queue) == 0 {
		return parcel{}, true, false
	}
	x = p.queue[0]
	p.queue[0] = parcel{}
	p.queue = p.queue[1:]
	p.bytes -= x.size()
	return x, len(p.queue) == 0, true
}

// write sends what is queued until the peer ends or breaks.
func (p *peer) write() {
	for {
		x, last, ok := p.next()
		if !ok {
			p.hangUp()
			return
		}
		err := p.transmit(x)
		if err == nil && last {
			err = p.flush()
		}
		if err != nil {
			p.drop(err)
		}
	}
}

func (p *peer) transmit(x parcel) error {
	if x.name != "" {
		return p.command(x.name, x.frames[0])
	}
	return p.send(x.frames)
}

// end lets the writer finish its queue and then tells the peer that no more
// comes. It does not wait.
func (p *peer) end() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.ending = true
	p.wake.Broadcast()
}

// hangUp ends our side of the connection; the peer still gets what was sent.
func (p *peer) hangUp() {
	if c, ok := p.raw.Conn.(interface{ CloseWrite() error }); ok {
		c.CloseWrite()
	}
}

// cause returns the error that ended the peer.
func (p *peer) cause() error {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.err
}

// read passes the messages of the peer to handle until the connection ends.
// Commands other than ping are passed to command, when that is not nil.
func (p *peer) read(handle func(frames [][]byte), command func(zmq4.Cmd)) error {
	for {
		frames, isCommand, err := p.receive()
		if err != nil {
			return err
		}
		if !isCommand {
			handle(frames)
			continue
		}
		c, err := parseCommand(frames)
		if err != nil {
			return err
		}
		if c.Name == zmq4.CmdPing {
			p.put(parcel{name: zmq4.CmdPong, frames: [][]byte{c.Body[min(2, len(c.Body)):]}})
		} else if command != nil {
			command(c)
		}
	}
}

// parseCommand reads a ZMTP command: a name after its length, and a body.
func parseCommand(frames [][]byte) (zmq4.Cmd, error) {
	if len(frames) != 1 || len(frames[0]) == 0 || len(frames[0]) <= int(frames[0][0]) {
		return zmq4.Cmd{}, fmt.Errorf("broken command of %d frames", len(frames))
	}
	n := 1 + int(frames[0][0])
	return zmq4.Cmd{Name: string(frames[0][1:n]), Body: frames[0][n:]}, nil
}
