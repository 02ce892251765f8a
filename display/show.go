package display

import (
	"fmt"
	"io"
	"os"
	"strings"
)

// A Group is several values that are shown one after the other.
type Group []any

// Err returns the first error that a value of the group carries.
func (g Group) Err() error {
	for _, v := range g {
		if err := firstError(v); err != nil {
			return err
		}
	}
	return nil
}

// String returns the plain text of all values.
func (g Group) String() string {
	parts := make([]string, len(g))
	for i, v := range g {
		parts[i] = Render(v).Text()
	}
	return strings.Join(parts, "\n\n")
}

func (g Group) bundle() Bundle { return plainBundle(g.String()) }

// Show prints the plain text of each value to standard output, in order. It stops
// at the first value that is an error or carries one, such as a figure with an
// unknown name, and returns that. In a notebook it shows the values themselves.
func Show(values ...any) error { return Fshow(os.Stdout, values...) }

// Fshow is Show to any writer.
func Fshow(w io.Writer, values ...any) error {
	if len(values) == 0 {
		return errNothing
	}
	for _, v := range values {
		if err := firstError(v); err != nil {
			return err
		}
		if _, err := fmt.Fprintln(w, Render(v).Text()); err != nil {
			return err
		}
	}
	return nil
}
