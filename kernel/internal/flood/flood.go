// Package flood limits what a cell prints, so that an endless loop with a print
// in it leaves a notebook that can still be opened: the head goes out as it
// comes; of what is over it the tail is kept for the end of the cell, with a
// line that says how much was left out between them.
package flood

import (
	"bytes"
	"fmt"
	"unicode/utf8"
)

// Head and Tail are how many bytes of a cell's streams are kept.
const (
	Head = 1 << 19
	Tail = 1 << 19
)

// A Limit holds back what a cell prints beyond the head. The zero value is
// ready for use by one goroutine at a time.
type Limit struct {
	head  int  // bytes that went out
	tail  Runs // what came after them
	lost  int  // bytes dropped between head and tail
	lines int  // line ends in them
	ended bool
}

// Write takes text and returns what of it goes out now.
func (l *Limit) Write(name, text string) (now string) {
	fits := min(len(text), Head-l.head)
	for fits > 0 && fits < len(text) && !utf8.RuneStart(text[fits]) {
		fits--
	}
	if l.tail != nil || l.lost > 0 {
		fits = 0
	}
	l.head += fits
	if rest := text[fits:]; rest != "" {
		return text[:fits] + l.over(name, rest)
	}
	return text[:fits]
}

// over takes text for which the head has no room. After the end of the cell
// there is no tail any more.
func (l *Limit) over(name, text string) (now string) {
	if l.ended {
		if l.lost == 0 {
			now = "\n... what this cell prints from here on is left out ...\n"
		}
		l.lost += len(text)
		return now
	}
	l.tail.Add(name, text)
	if l.tail.size() > 2*Tail { // seldom, so that it costs little
		l.trim()
	}
	return ""
}

func (l *Limit) trim() {
	dropped, lines := l.tail.trim(Tail)
	l.lost += dropped
	l.lines += lines
}

// End hands out what was held back: the cell has ended.
func (l *Limit) End(publish func(name, text string)) {
	l.ended = true
	l.trim()
	for i, r := range l.tail {
		if i == 0 && l.lost > 0 {
			publish(r.Name, fmt.Sprintf("\n... %d bytes (%d lines) of output left out ...\n", l.lost, l.lines))
		}
		publish(r.Name, string(bytes.ToValidUTF8(r.Text, nil)))
	}
	l.tail = nil
}

// Runs is text of several streams in the order in which it came.
type Runs []Run

// A Run is text of one stream.
type Run struct {
	Name string
	Text []byte
}

// Add appends text to the last run when that is of the same stream.
func (rs *Runs) Add(name, text string) {
	if n := len(*rs); n > 0 && (*rs)[n-1].Name == name {
		(*rs)[n-1].Text = append((*rs)[n-1].Text, text...)
		return
	}
	*rs = append(*rs, Run{name, []byte(text)})
}

func (rs Runs) size() (n int) {
	for _, r := range rs {
		n += len(r.Text)
	}
	return n
}

// trim drops text from the front until at most limit bytes are left, and on to
// the next line end in them. It returns how many bytes and line ends it dropped.
func (rs *Runs) trim(limit int) (dropped, lines int) {
	excess := rs.size() - limit
	for excess > 0 {
		r := &(*rs)[0]
		n := min(excess, len(r.Text))
		if eol := bytes.IndexByte(r.Text[n:], '\n'); n < len(r.Text) && eol >= 0 && eol < limit/2 {
			n += eol + 1
		}
		dropped += n
		lines += bytes.Count(r.Text[:n], []byte("\n"))
		r.Text = append([]byte(nil), r.Text[n:]...)
		if len(r.Text) == 0 {
			*rs = (*rs)[1:]
		}
		excess -= n
	}
	return dropped, lines
}
