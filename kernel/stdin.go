package kernel

import (
	"context"
	"encoding/json"
	"errors"
	"sync"

	"brinkline/kernel/wire"
)

// errNoInput is returned to a cell whose client takes no input requests.
var errNoInput = errors.New("this front end does not let a cell ask for input")

// stdin passes the answer to an input request to the cell that waits for it.
type stdin struct {
	mu      sync.Mutex
	answers chan string // nil when no cell waits
	from    string      // identity of the client that was asked
}

// deliver takes an input_reply. One that nobody waits for is dropped.
func (s *stdin) deliver(m *wire.Message) {
	var r struct{ Value string }
	if m.Header.Type != "input_reply" || json.Unmarshal(m.Content, &r) != nil {
		return
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.answers == nil || m.Identity() != s.from {
		return
	}
	s.answers <- r.Value
	s.answers = nil
}

func (s *stdin) expect(from string) <-chan string {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.answers, s.from = make(chan string, 1), from
	return s.answers
}

func (s *stdin) forget() {
	s.mu.Lock()
	defer s.mu.Unlock()
	s.answers = nil
}

// Input asks the user of the cell for a line. It ends when ctx is done.
func (o *output) Input(ctx context.Context, prompt string, password bool) (string, error) {
	if !o.input {
		return "", errNoInput
	}
	o.mu.Lock()
	o.stream.flush()
	o.mu.Unlock()
	answers := o.k.stdin.expect(o.parent.Identity())
	defer o.k.stdin.forget()
	err := o.k.sockets.Ask(o.parent, "input_request", content{"prompt": prompt, "password": password})
	if err != nil {
		return "", err
	}
	select {
	case text := <-answers:
		return text, nil
	case <-ctx.Done():
		return "", ctx.Err()
	}
}
