package flood

import (
	"fmt"
	"strings"
	"testing"
	"unicode/utf8"
)

// run prints text in pieces and returns all that goes out.
func run(l *Limit, text string, piece int) string {
	var out strings.Builder
	for text != "" {
		n := min(piece, len(text))
		out.WriteString(l.Write("stdout", text[:n]))
		text = text[n:]
	}
	l.End(func(_, text string) { out.WriteString(text) })
	return out.String()
}

func TestUpToHeadAndTailNothingIsLost(t *testing.T) {
	text := strings.Repeat("0123456789abcde\n", (Head+Tail)/16)
	if got := run(&Limit{}, text, 1000); got != text {
		t.Errorf("%d bytes became %d", len(text), len(got))
	}
}

func TestTheMiddleOfAFloodIsLeftOutInWholeLines(t *testing.T) {
	var b strings.Builder
	for i := range 200_000 {
		fmt.Fprintf(&b, "line %d\n", i)
	}
	text := b.String()
	got := run(&Limit{}, text, 4096)
	notice := got[Head:]
	tail := notice[strings.Index(notice, " ...\n")+5:]
	left := len(text) - Head - len(tail)
	want := text[:Head] + fmt.Sprintf("\n... %d bytes (%d lines) of output left out ...\n", left, strings.Count(text[Head:Head+left], "\n")) + text[Head+left:]
	if got != want {
		t.Error("head, notice and tail do not fit together")
	}
	if !strings.HasPrefix(tail, "line ") || len(tail) > Tail || len(tail) < Tail-100 {
		t.Errorf("the tail has %d bytes and begins %q", len(tail), tail[:20])
	}
}

func TestCharactersAreNotCut(t *testing.T) {
	text := "x" + strings.Repeat("λ", Head)
	if got := run(&Limit{}, text, len(text)); !utf8.ValidString(got) {
		t.Error("the output is not UTF-8")
	}
}

func TestPrintsAfterTheEndOfAFullCellAreLeftOutWithOneNotice(t *testing.T) {
	l := &Limit{}
	run(l, strings.Repeat("x", Head), Head)
	first, second := l.Write("stdout", "late"), l.Write("stdout", "later")
	if first != "\n... what this cell prints from here on is left out ...\n" || second != "" {
		t.Errorf("%q, %q", first, second)
	}
}
