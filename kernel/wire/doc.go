// Package wire speaks the open notebook messaging protocol, version 5.5: the
// connection file, signed messages, and the five sockets on which they travel.
// It knows nothing of cells.
//
// The ZeroMQ handshake and framing come from github.com/go-zeromq/zmq4. The
// sockets are our own: every peer has one reader, one bounded queue and one
// writer with a deadline, so that a peer that stalls holds up nobody else, and
// subscriptions are seen as they arrive, which the welcome message needs.
package wire

// ProtocolVersion is the version of the messaging protocol that is spoken.
const ProtocolVersion = "5.5"
