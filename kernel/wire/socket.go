package wire

import (
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"sync"
	"time"

	"github.com/go-zeromq/zmq4"
)

// socket is a bound ZeroMQ socket: it accepts peers, and keeps those that have
// completed the handshake under their identities.
type socket struct {
	name     string // in log lines
	kind     zmq4.SocketType
	listener net.Listener
	patience timeouts
	logf     func(format string, args ...any)

	message func(*peer, [][]byte) // called by the peer's reader
	command func(*peer, zmq4.Cmd) // likewise; may be nil
	leave   func(*peer)           // called when a peer is gone; may be nil

	mu      sync.Mutex
	peers   map[string]*peer
	waiting map[net.Conn]bool // in the handshake
	made    int               // identities made up so far
	closed  bool
	work    sync.WaitGroup
}

func (s *socket) serve() {
	s.peers = make(map[string]*peer)
	s.waiting = make(map[net.Conn]bool)
	s.work.Go(s.accept)
}

func (s *socket) accept() {
	for {
		c, err := s.listener.Accept()
		if errors.Is(err, net.ErrClosed) {
			return
		}
		if err != nil { // such as too many open files
			s.logf("%s socket: %v", s.name, err)
			time.Sleep(50 * time.Millisecond)
			continue
		}
		if !s.await(c, true) {
			c.Close()
			return
		}
		s.work.Go(func() { s.attend(c) })
	}
}

// await marks a connection as waiting for its handshake, or as no longer so. It
// returns false when the socket is closed.
func (s *socket) await(c net.Conn, waiting bool) bool {
	s.mu.Lock()
	defer s.mu.Unlock()
	if waiting && !s.closed {
		s.waiting[c] = true
	} else {
		delete(s.waiting, c)
	}
	return !s.closed
}

// attend serves one connection to its end.
func (s *socket) attend(c net.Conn) {
	defer c.Close()
	l, err := handshake(c, s.kind, s.patience)
	if open := s.await(c, false); err != nil || !open {
		if open && !errors.Is(err, io.EOF) {
			s.logf("%s socket: a peer was turned away: %v", s.name, err)
		}
		return
	}
	p := newPeer(l)
	if !s.admit(p) {
		return
	}
	s.work.Go(p.write)
	err = p.read(
		func(frames [][]byte) { s.message(p, frames) },
		func(c zmq4.Cmd) {
			if s.command != nil {
				s.command(p, c)
			}
		})
	p.drop(err)
	s.remove(p)
}

// admit enters p among the peers. A peer of the same identity makes place: its
// client has connected anew.
func (s *socket) admit(p *peer) bool {
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.closed {
		return false
	}
	if p.id == "" {
		s.made++
		p.id = fmt.Sprintf("\x00%d", s.made)
	}
	if old := s.peers[p.id]; old != nil {
		old.drop(errors.New("replaced"))
	}
	s.peers[p.id] = p
	return true
}

func (s *socket) remove(p *peer) {
	s.mu.Lock()
	if s.peers[p.id] == p {
		delete(s.peers, p.id)
	}
	closed := s.closed
	s.mu.Unlock()
	if err := p.cause(); errors.Is(err, errOverrun) || errors.Is(err, os.ErrDeadlineExceeded) {
		s.logf("%s socket: a peer that does not take its messages was dropped", s.name)
	}
	if s.leave != nil && !closed {
		s.leave(p)
	}
}

// peer returns the peer of an identity, nil when it is gone.
func (s *socket) peer(id string) *peer {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.peers[id]
}

// all returns the present peers.
func (s *socket) all() []*peer {
	s.mu.Lock()
	defer s.mu.Unlock()
	ps := make([]*peer, 0, len(s.peers))
	for _, p := range s.peers {
		ps = append(ps, p)
	}
	return ps
}

// stop accepts no more peers and lets the present ones end.
func (s *socket) stop() {
	s.listener.Close() // removes a socket file
	s.mu.Lock()
	s.closed = true
	for c := range s.waiting {
		c.Close()
	}
	s.mu.Unlock()
	for _, p := range s.all() {
		p.end()
	}
}

// finish waits for the peers to take what was queued and to hang up, at most
// until the time given, and closes what is left.
func (s *socket) finish(until time.Time) {
	gone := make(chan struct{})
	go func() {
		s.work.Wait()
		close(gone)
	}()
	select {
	case <-gone:
		return
	case <-time.After(time.Until(until)):
	}
	for _, p := range s.all() {
		p.drop(net.ErrClosed)
	}
	<-gone
}
