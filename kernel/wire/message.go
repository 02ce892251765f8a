package wire

import (
	"bytes"
	"crypto/rand"
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"time"
)

// Header is what heads a message.
type Header struct {
	ID         string `json:"msg_id"`
	Session    string `json:"session"`
	Username   string `json:"username"`
	Date       string `json:"date"` // ISO 8601 with zone
	Type       string `json:"msg_type"`
	Version    string `json:"version"`
	SubshellID string `json:"subshell_id,omitempty"`
}

// Message is a message that was received.
type Message struct {
	Header   Header
	Parent   Header
	Metadata json.RawMessage
	Content  json.RawMessage
	Buffers  [][]byte

	// RawHeader holds the bytes of the header as they came, to be sent back as
	// the parent header of all that answers the message.
	RawHeader json.RawMessage

	identity string   // of the peer that it came from
	route    [][]byte // further identities, of peers behind that peer
}

// Identity returns the ZeroMQ identity of the peer that sent m.
func (m *Message) Identity() string { return m.identity }

// delimiter ends the identities in front of a message.
var delimiter = []byte("<IDS|MSG>")

// codec turns messages into frames and frames into messages. It is safe for
// concurrent use.
type codec struct {
	signer   signer
	replays  replays
	session  string
	username string
}

func newCodec(s signer) *codec {
	name := os.Getenv("USER")
	if name == "" {
		name = "kernel"
	}
	return &codec{signer: s, session: NewID(), username: name}
}

// NewID returns a new random identifier (UUID version 4).
func NewID() string {
	var b [16]byte
	rand.Read(b[:]) // never fails
	b[6] = b[6]&0x0f | 0x40
	b[8] = b[8]&0x3f | 0x80
	return fmt.Sprintf("%x-%x-%x-%x-%x", b[:4], b[4:6], b[6:8], b[8:10], b[10:])
}

// encode returns the msg_id and the frames of a new message, the delimiter first.
// A nil parent gives an empty parent header, nil metadata and content an empty
// object.
func (c *codec) encode(msgType string, parent *Message, metadata, content any, buffers [][]byte) (id string, frames [][]byte, err error) {
	id = NewID()
	header, err := Marshal(Header{
		ID:       id,
		Session:  c.session,
		Username: c.username,
		Date:     time.Now().UTC().Format("2006-01-02T15:04:05.000000Z"),
		Type:     msgType,
		Version:  ProtocolVersion,
	})
	if err != nil {
		return "", nil, err
	}
	parts := [][]byte{header, []byte("{}"), []byte("{}"), []byte("{}")}
	if parent != nil {
		parts[1] = parent.RawHeader
	}
	for i, v := range []any{metadata, content} {
		if v == nil {
			continue
		}
		if parts[2+i], err = Marshal(v); err != nil {
			return "", nil, fmt.Errorf("%s: %w", msgType, err)
		}
	}
	frames = append([][]byte{delimiter, c.signer.sign(parts)}, parts...)
	return id, append(frames, buffers...), nil
}

// decode checks the frames of a message and reads them. The identities before
// the delimiter become the message's route.
func (c *codec) decode(frames [][]byte) (*Message, error) {
	i := 0
	for i < len(frames) && !bytes.Equal(frames[i], delimiter) {
		i++
	}
	if len(frames) < i+6 {
		return nil, fmt.Errorf("message of %d frames is too short", len(frames))
	}
	signature, parts := frames[i+1], frames[i+2:i+6]
	if !c.signer.verify(signature, parts) {
		return nil, errors.New("message with a wrong signature")
	}
	m := &Message{route: frames[:i], Buffers: frames[i+6:]}
	if err := m.read(parts); err != nil {
		return nil, err
	}
	if len(signature) > 0 && !c.replays.add(signature) {
		return nil, fmt.Errorf("%s with a signature that was used before", m.Header.Type)
	}
	return m, nil
}

func (m *Message) read(parts [][]byte) error {
	names := [4]string{"header", "parent header", "metadata", "content"}
	for i, p := range parts {
		parts[i] = bytes.ToValidUTF8(p, []byte("\uFFFD"))
		if p := bytes.TrimSpace(parts[i]); !json.Valid(p) || p[0] != '{' {
			return fmt.Errorf("message whose %s is not a JSON object", names[i])
		}
	}
	if err := json.Unmarshal(parts[0], &m.Header); err != nil {
		return fmt.Errorf("message with a broken header: %w", err)
	}
	if m.Header.Type == "" {
		return errors.New("message without msg_type")
	}
	_ = json.Unmarshal(parts[1], &m.Parent) // only compared with what we sent
	m.RawHeader, m.Metadata, m.Content = parts[0], parts[2], parts[3]
	return nil
}
