package kernel

import (
	"context"
	"encoding/json"
	"errors"
	"sync"
	"time"

	"brinkline/kernel/wire"
)

// errNoInput is returned to a cell whose client takes no input requests.
var errNoInput = errors.New("this front end does not let a cell ask for input")

// stdin passes the answer to an input request to the cell that waits for it.
type stdin struct {
	mu      sync.Mutex
	answers chan string // nil when no cell waits
	from    string      // identity of the client that was asked
	asked   [2]string   // msg_id of the input request, and of the cell's request
}

// ask sends an input request and returns where the answer will come.
func (s *stdin) ask(sockets *wire.Sockets, cell *wire.Message, c content) (<-chan string, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	id, err := sockets.Ask(cell, "input_request", c)
	if err != nil {
		return nil, err
	}
	s.answers = make(chan string, 1)
	s.from, s.asked = cell.Identity(), [2]string{id, cell.Header.ID}
	return s.answers, nil
}

// deliver takes an input_reply. One that nobody waits for, or that says that it
// answers something else, is dropped.
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
	if id := m.Parent.ID; id != "" && id != s.asked[0] && id != s.asked[1] {
		return
	}
	s.answers <- r.Value
	s.answers = nil
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
	request := content{"prompt": prompt, "password": password}
	answers, err := o.k.stdin.ask(o.k.sockets, o.parent, request)
	for patience := 100; err != nil && patience > 0 && ctx.Err() == nil; patience-- {
		time.Sleep(10 * time.Millisecond) // the client's stdin channel may not be up yet
		answers, err = o.k.stdin.ask(o.k.sockets, o.parent, request)
	}
	if err != nil {
		return "", err
	}
	defer o.k.stdin.forget()
	select {
	case text := <-answers:
		return text, nil
	case <-ctx.Done():
		return "", ctx.Err()
	}
}
