package wire

import (
	"bufio"
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"net"
	"sync/atomic"
	"time"

	"github.com/go-zeromq/zmq4"
	"github.com/go-zeromq/zmq4/security/null"
)

const (
	maxFrames  = 1 << 12 // in a message
	maxMessage = 1 << 30 // bytes in a message
)

// link is a connection to a ZeroMQ peer after the handshake. One goroutine may
// read from it and another one write.
type link struct {
	conn *zmq4.Conn
	raw  *pacedConn
	in   *bufio.Reader
}

// handshake makes a link of a connection that was accepted. The peer has until
// the deadline to complete the ZMTP handshake.
func handshake(raw net.Conn, kind zmq4.SocketType, t timeouts) (l *link, err error) {
	defer func() {
		if e := recover(); e != nil { // the library slices by lengths that the peer names
			err = fmt.Errorf("broken handshake: %v", e)
		}
	}()
	paced := &pacedConn{Conn: raw, limit: t.write}
	if err := raw.SetDeadline(time.Now().Add(t.handshake)); err != nil {
		return nil, err
	}
	conn, err := zmq4.Open(paced, null.Security(), kind, nil, true, nil)
	if err != nil {
		return nil, err
	}
	if err := raw.SetDeadline(time.Time{}); err != nil {
		return nil, err
	}
	paced.out = bufio.NewWriterSize(writerFunc(paced.write), 1<<14)
	return &link{conn: conn, raw: paced, in: bufio.NewReader(raw)}, nil
}

// identity returns the identity that the peer gave itself, "" for none.
func (l *link) identity() string { return l.conn.Peer.Meta["Identity"] }

// send writes a message, flush sees it off.
func (l *link) send(frames [][]byte) error { return l.conn.SendMsg(zmq4.NewMsgFrom(frames...)) }

func (l *link) command(name string, body []byte) error { return l.conn.SendCmd(name, body) }

func (l *link) flush() error { return l.raw.out.Flush() }

// receive reads the next message or command. The library's own RecvMsg would
// allocate what a frame's length promises and answer a ping in the middle of
// what the writer is sending.
func (l *link) receive() (frames [][]byte, command bool, err error) {
	left := uint64(maxMessage)
	for more := true; more; {
		var size uint64
		var flags byte
		if flags, size, err = l.frameHead(); err != nil {
			return nil, false, err
		}
		if size > left || len(frames) == maxFrames {
			return nil, false, errors.New("message is too large")
		}
		left -= size
		var body bytes.Buffer // grows with what arrives, not with what was promised
		if _, err := io.CopyN(&body, l.in, int64(size)); err != nil {
			return nil, false, err
		}
		frames = append(frames, body.Bytes())
		more = flags&1 != 0
		command = flags&4 != 0
	}
	return frames, command, nil
}

// frameHead reads the flags and the length of a frame (ZMTP 3.0, framing).
func (l *link) frameHead() (flags byte, size uint64, err error) {
	if flags, err = l.in.ReadByte(); err != nil {
		return 0, 0, err
	}
	if flags&2 == 0 {
		n, err := l.in.ReadByte()
		return flags, uint64(n), err
	}
	var long [8]byte
	_, err = io.ReadFull(l.in, long[:])
	return flags, binary.BigEndian.Uint64(long[:]), err
}

// pacedConn is a connection whose writes are gathered in out, once that is set,
// and then fail when the peer takes nothing for the time limit.
type pacedConn struct {
	net.Conn
	out   *bufio.Writer
	limit time.Duration
	since atomic.Int64 // when the write that is under way began, Unix nanoseconds; 0 when none is
}

func (c *pacedConn) Write(p []byte) (int, error) {
	if c.out != nil {
		return c.out.Write(p)
	}
	return c.Conn.Write(p)
}

// write passes p on in pieces, each with the full time limit.
func (c *pacedConn) write(p []byte) (n int, err error) {
	defer c.since.Store(0)
	for n < len(p) && err == nil {
		now := time.Now()
		c.since.Store(now.UnixNano())
		if err = c.Conn.SetWriteDeadline(now.Add(c.limit)); err != nil {
			break
		}
		var k int
		k, err = c.Conn.Write(p[n:min(n+1<<16, len(p))])
		n += k
	}
	return n, err
}

// stuckFor returns how long the peer has taken nothing of what it is sent.
func (c *pacedConn) stuckFor() time.Duration {
	if since := c.since.Load(); since != 0 {
		return time.Since(time.Unix(0, since))
	}
	return 0
}

type writerFunc func(p []byte) (int, error)

func (f writerFunc) Write(p []byte) (int, error) { return f(p) }
