package report

import (
	"fmt"
	"html"
	"regexp"
	"strings"
	"unicode"
)

// Longer texts are cut in the middle: a page is for readers, and the notebook
// has it all.
const (
	maxLines = 300
	maxWidth = 2000
)

func escaped(s string) string { return html.EscapeString(s) }

var escapeSequence = regexp.MustCompile("\x1b(\\[[0-9;?]*[ -/]*[@-~]|\\][^\x07\x1b]*(\x07|\x1b\\\\)|[@-Z\\\\-_])")

// printable takes away the control sequences of terminals and what HTML can't
// hold.
func printable(s string) string {
	s = escapeSequence.ReplaceAllString(s, "")
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) && r != '\n' && r != '\t' {
			return -1
		}
		return r
	}, s)
}

// terminal returns a text as a terminal would leave it: what follows a carriage
// return overwrites its line.
func terminal(s string) string {
	s = strings.ReplaceAll(s, "\r\n", "\n")
	lines := strings.Split(strings.TrimSuffix(s, "\n"), "\n")
	for i, line := range lines {
		line = strings.TrimRight(line, "\r")
		lines[i] = printable(line[strings.LastIndexByte(line, '\r')+1:])
	}
	return strings.Join(shortened(lines), "\n")
}

// shortened keeps the head and the tail of a long text.
func shortened(lines []string) []string {
	for i, line := range lines {
		if runes := []rune(line); len(runes) > maxWidth {
			lines[i] = string(runes[:maxWidth]) + fmt.Sprintf(" … %d characters left out", len(runes)-maxWidth)
		}
	}
	left := len(lines) - maxLines
	if left <= 0 {
		return lines
	}
	head, tail := lines[:maxLines/2], lines[len(lines)-maxLines/2:]
	kept := append(append([]string{}, head...), fmt.Sprintf("… %d lines left out; the notebook has them …", left))
	return append(kept, tail...)
}
