package wire

import (
	"bytes"
	"sync"

	"github.com/go-zeromq/zmq4"
)

// publisher is an XPUB socket that sees each subscription.
type publisher struct {
	*socket
	welcome    func(p *peer, topic string) // called first of all on every subscription
	subscribed func()                      // called then

	mu     sync.Mutex               // orders messages the same way for all peers
	topics map[*peer]map[string]int // subscriptions and how often each was made
}

func newPublisher(s *socket) *publisher {
	p := &publisher{socket: s, topics: make(map[*peer]map[string]int)}
	p.kind = zmq4.XPub
	p.message = p.frame
	p.command = p.cmd
	p.leave = func(x *peer) {
		p.mu.Lock()
		defer p.mu.Unlock()
		delete(p.topics, x)
	}
	return p
}

// frame reads a subscription as peers of ZMTP 3.0 make it: a message of one
// frame that begins with 1 to subscribe and 0 to cancel.
func (p *publisher) frame(from *peer, frames [][]byte) {
	if len(frames) != 1 || len(frames[0]) == 0 || frames[0][0] > 1 {
		return
	}
	p.subscribe(from, string(frames[0][1:]), frames[0][0] == 1)
}

// cmd reads a subscription as peers of ZMTP 3.1 may make it.
func (p *publisher) cmd(from *peer, c zmq4.Cmd) {
	if c.Name == zmq4.CmdSubscribe || c.Name == zmq4.CmdCancel {
		p.subscribe(from, string(c.Body), c.Name == zmq4.CmdSubscribe)
	}
}

// subscribe changes what a peer gets. Nothing reaches it before its welcome.
func (p *publisher) subscribe(from *peer, topic string, on bool) {
	p.count(from, topic, on)
	if on {
		p.subscribed()
	}
}

func (p *publisher) count(from *peer, topic string, on bool) {
	p.mu.Lock()
	defer p.mu.Unlock()
	topics := p.topics[from]
	if topics == nil {
		topics = make(map[string]int)
		p.topics[from] = topics
	}
	if on {
		topics[topic]++
		p.welcome(from, topic)
	} else if topics[topic]--; topics[topic] <= 0 {
		delete(topics, topic)
	}
}

// publish sends frames, of which the first is the topic, to all that have
// subscribed to a prefix of it. It does not block.
func (p *publisher) publish(frames [][]byte) {
	p.mu.Lock()
	defer p.mu.Unlock()
	for x, topics := range p.topics {
		for topic := range topics {
			if bytes.HasPrefix(frames[0], []byte(topic)) {
				x.offer(frames)
				break
			}
		}
	}
}

// crowded reports whether messages pile up at a peer that is taking them.
func (p *publisher) crowded() bool {
	for _, x := range p.all() {
		if x.crowded() {
			return true
		}
	}
	return false
}
