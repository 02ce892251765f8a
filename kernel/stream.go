package kernel

import (
	"bytes"
	"fmt"
	"sync"
	"time"
	"unicode/utf8"
)

// What a cell prints is gathered, so that a flood does not freeze the page, and
// limited: the head goes out as it comes, of what is over it the tail is kept
// for the end.
const (
	streamPause = 50 * time.Millisecond // a message
	streamHead  = 1 << 19               // bytes
	streamTail  = 1 << 19               // bytes
	inOrder     = 8                     // runs of one stream kept in order in one go
)

// stream gathers the text of a cell. All methods are called with the lock held.
type stream struct {
	lock    sync.Locker
	publish func(name, text string)

	pending runs // will be published next
	timer   *time.Timer
	armed   bool      // the timer is running
	next    time.Time // when the timer may publish again

	head  int  // bytes that went to pending
	tail  runs // what is over the head
	lost  int  // bytes that were dropped between head and tail
	lines int  // line ends in them
	ended bool // the cell has ended; there is no tail any more
}

func (s *stream) write(name, text string) {
	fits := min(len(text), streamHead-s.head)
	for fits > 0 && fits < len(text) && !utf8.RuneStart(text[fits]) {
		fits--
	}
	if s.tail != nil || s.lost > 0 {
		fits = 0
	}
	if fits > 0 {
		s.head += fits
		s.pending.add(name, text[:fits])
		s.arm()
	}
	if rest := text[fits:]; rest != "" {
		s.over(name, rest)
	}
}

// over takes text for which the head has no room.
func (s *stream) over(name, text string) {
	if !s.ended {
		s.tail.add(name, text)
		if s.tail.size() > 2*streamTail { // seldom, so that it costs little
			s.trim()
		}
		return
	}
	if s.lost == 0 {
		s.pending.add(name, "\n... what this cell prints from here on is left out ...\n")
		s.arm()
	}
	s.lost += len(text)
}

func (s *stream) trim() {
	bytes, lines := s.tail.trim(streamTail)
	s.lost += bytes
	s.lines += lines
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
		rs = rs.byStream()
	}
	for i := range rs {
		r := &rs[i]
		if !all {
			n := len(r.text) - openRune(r.text)
			if n < len(r.text) {
				s.pending.add(r.name, string(r.text[n:]))
				r.text = r.text[:n]
			}
		}
		if len(r.text) > 0 {
			s.publish(r.name, string(r.text))
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
	s.ended = true
	s.trim()
	for i, r := range s.tail {
		if i == 0 && s.lost > 0 {
			s.publish(r.name, fmt.Sprintf("\n... %d bytes (%d lines) of output left out ...\n", s.lost, s.lines))
		}
		s.publish(r.name, string(bytes.ToValidUTF8(r.text, nil)))
	}
	s.tail = nil
}

// runs is text of several streams in the order in which it came.
type runs []run

type run struct {
	name string
	text []byte
}

func (rs *runs) add(name, text string) {
	if n := len(*rs); n > 0 && (*rs)[n-1].name == name {
		(*rs)[n-1].text = append((*rs)[n-1].text, text...)
		return
	}
	*rs = append(*rs, run{name, []byte(text)})
}

func (rs runs) size() (n int) {
	for _, r := range rs {
		n += len(r.text)
	}
	return n
}

// byStream gathers the text of each stream in one run.
func (rs runs) byStream() (out runs) {
	at := make(map[string]int)
	for _, r := range rs {
		i, ok := at[r.name]
		if !ok {
			i = len(out)
			at[r.name] = i
			out = append(out, run{name: r.name})
		}
		out[i].text = append(out[i].text, r.text...)
	}
	return out
}

// trim drops text from the front until at most limit bytes are left, and on to
// the next line end in them. It returns how many bytes and line ends it dropped.
func (rs *runs) trim(limit int) (dropped, lines int) {
	excess := rs.size() - limit
	for excess > 0 {
		r := &(*rs)[0]
		n := min(excess, len(r.text))
		if eol := bytes.IndexByte(r.text[n:], '\n'); n < len(r.text) && eol >= 0 && eol < limit/2 {
			n += eol + 1
		}
		dropped += n
		lines += bytes.Count(r.text[:n], []byte("\n"))
		r.text = append([]byte(nil), r.text[n:]...)
		if len(r.text) == 0 {
			*rs = (*rs)[1:]
		}
		excess -= n
	}
	return dropped, lines
}
