package session

import (
	"fmt"
	"sync"
	"sync/atomic"
	"time"

	"brinkline/continuation"
	"brinkline/display"
)

// Work that takes longer than patienceBeforeBar shows a live display, at most every barInterval.
const (
	patienceBeforeBar = time.Second
	barInterval       = 125 * time.Millisecond
)

var displayCount atomic.Int64

// progressMeter shows how the toolkit's work in a cell goes on.
type progressMeter struct {
	run     *run
	mu      sync.Mutex
	task    string
	started time.Time
	last    time.Time
	id      string
	pending *continuation.Progress
}

// Progress implements continuation.Observer for the models of the session.
func (s *Session) Progress(p continuation.Progress) {
	if r := s.runningRun(); r != nil && !s.still {
		r.progress.tell(p)
	}
}

func (m *progressMeter) tell(p continuation.Progress) {
	m.mu.Lock()
	defer m.mu.Unlock()
	now := time.Now()
	if p.Task != m.task || m.started.IsZero() {
		m.flush()
		m.task, m.started, m.id = p.Task, now, ""
	}
	if now.Sub(m.started) < patienceBeforeBar {
		return
	}
	if p.Done {
		m.pending = &p
		m.flush()
		m.started = time.Time{}
		return
	}
	if now.Sub(m.last) < barInterval {
		m.pending = &p
		return
	}
	m.last = now
	m.show(p)
}

func (m *progressMeter) show(p continuation.Progress) {
	m.pending = nil
	b := display.Render(p)
	b.Metadata = map[string]any{"brinkline": map[string]any{"progress": true}} // tells it from results
	if m.id == "" {
		m.id = fmt.Sprintf("progress-%d-%d", time.Now().UnixNano(), displayCount.Add(1))
		m.run.out.Display(b, m.id)
		return
	}
	m.run.out.Update(b, m.id)
}

// flush shows what was held back, so that the last state is what stays.
func (m *progressMeter) flush() {
	if m.pending != nil && m.id != "" {
		m.show(*m.pending)
	}
	m.pending = nil
}

func (m *progressMeter) finish() {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.flush()
}
