package kernel

import (
	"sync"
	"time"
	"unicode/utf8"

	"brinkline/kernel/internal/flood"
)

// What a cell prints is gathered, so that a flood does not freeze the page, and
// limited by package flood.
const (
	streamPause = 50 * time.Millisecond // a message
	inOrder     = 8                     // runs of one stream kept in order in one go
)

// stream gathers the text of a cell. All methods are called with the lock held.
type stream struct {
	lock    sync.Locker
	publish func(name, text string)

	limit   flood.Limit
	pending flood.Runs // will be published next
	timer   *time.Timer
	armed   bool      // the timer is running
	next    time.Time // when the timer may publish again
}

func (s *stream) write(name, text string) {
	if now := s.limit.Write(name, text); now != "" {
		s.pending.Add(name, now)
		s.arm()
	}
}

// arm sees to it that what is pending is published soon.
func (s *stream) arm() {
	if s.armed {
		return
	}
	s.armed = true
	wait := max(streamPause, time.Until(s.next))
	if s.timer != nil {
		s.timer.Reset(wait)
		return
	}
	s.timer = time.AfterFunc(wait, func() {
		s.lock.Lock()
		defer s.lock.Unlock()
		s.armed = false
		s.send(false)
	})
}

// flush publishes what is pending now.
func (s *stream) flush() { s.send(true) }

// send publishes what is pending. Unless it is all, the begin of a character
// whose end has not come yet is held back.
func (s *stream) send(all bool) {
	rs := s.pending
	s.pending = nil
	if len(rs) > inOrder {
		rs = byStream(rs)
	}
	for i := range rs {
		r := &rs[i]
		if !all {
			n := len(r.Text) - openRune(r.Text)
			if n < len(r.Text) {
				s.pending.Add(r.Name, string(r.Text[n:]))
				r.Text = r.Text[:n]
			}
		}
		if len(r.Text) > 0 {
			s.publish(r.Name, string(r.Text))
		}
	}
	s.next = time.Now().Add(time.Duration(len(rs)) * streamPause)
}

// openRune returns how many bytes at the end of text begin a character that is
// not complete.
func openRune(text []byte) int {
	for n := 1; n < utf8.UTFMax && n <= len(text); n++ {
		if last := text[len(text)-n:]; utf8.RuneStart(last[0]) {
			if utf8.FullRune(last) {
				return 0
			}
			return n
		}
	}
	return 0
}

// end publishes all that is left: the cell has ended.
func (s *stream) end() {
	s.flush()
	s.limit.End(s.publish)
}

// byStream gathers the text of each stream in one run.
func byStream(rs flood.Runs) (out flood.Runs) {
	at := make(map[string]int)
	for _, r := range rs {
		i, ok := at[r.Name]
		if !ok {
			i = len(out)
			at[r.Name] = i
			out = append(out, flood.Run{Name: r.Name})
		}
		out[i].Text = append(out[i].Text, r.Text...)
	}
	return out
}
