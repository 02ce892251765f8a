package display

import (
	"fmt"
	"html"
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

// bundle puts the values one under the other. Its html holds pictures as SVG.
func (g Group) bundle() Bundle {
	if err := g.Err(); err != nil {
		return plainBundle(err.Error())
	}
	b := plainBundle(g.String())
	var page strings.Builder
	for _, v := range g {
		part := Render(v)
		switch {
		case part.Data[MIMEHTML] != nil:
			fmt.Fprint(&page, part.Data[MIMEHTML])
		case part.Data[MIMESVG] != nil:
			fmt.Fprintf(&page, "<div>%s</div>\n", part.Data[MIMESVG])
		default:
			fmt.Fprintf(&page, "<pre>%s</pre>\n", html.EscapeString(part.Text()))
		}
	}
	b.Data[MIMEHTML] = page.String()
	return b
}

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
