package session

import (
	"io"
	"os"
)

// isStandard tells which of the cell's streams a writer is, "" for others.
func (s *Session) isStandard(w io.Writer) string {
	switch w {
	case io.Writer(os.Stdout):
		return "stdout"
	case io.Writer(os.Stderr):
		return "stderr"
	}
	return ""
}
