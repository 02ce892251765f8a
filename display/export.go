package display

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
)

// WriteSVG writes the figure as an SVG document.
func (f *Figure) WriteSVG(w io.Writer) error {
	if err := f.Err(); err != nil {
		return err
	}
	_, err := w.Write(f.built.svg())
	return err
}

// WritePNG writes the figure as a PNG with 144 dots to the inch.
func (f *Figure) WritePNG(w io.Writer) error {
	if err := f.Err(); err != nil {
		return err
	}
	_, err := w.Write(f.built.png())
	return err
}

// Save writes the figure to a file whose name ends in .svg or .png.
func (f *Figure) Save(path string) error {
	if err := f.Err(); err != nil {
		return err
	}
	var data []byte
	switch ext := strings.ToLower(filepath.Ext(path)); ext {
	case ".svg":
		data = f.built.svg()
	case ".png":
		data = f.built.png()
	default:
		return fmt.Errorf("a figure cannot be saved as %q; give the file a name that ends in .svg or .png", path)
	}
	return os.WriteFile(path, data, 0o644)
}
