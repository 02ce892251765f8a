package display

import (
	"encoding/base64"
	"math"
)

// The MIME types that renderers give.
const (
	MIMEPlain = "text/plain"
	MIMEHTML  = "text/html"
	MIMELaTeX = "text/latex"
	MIMESVG   = "image/svg+xml"
	MIMEPNG   = "image/png"
)

// A Bundle is one value in the forms in which front ends can show it.
type Bundle struct {
	// Data maps a MIME type to its content: a string, base64 without line breaks
	// for image/png, or a JSON value for types that end in +json.
	Data map[string]any
	// Metadata maps a MIME type to what belongs to it: image/png has its alt text
	// and its size on the page in pixels.
	Metadata map[string]any
}

// Text returns the plain text of the bundle.
func (b Bundle) Text() string {
	text, _ := b.Data[MIMEPlain].(string)
	return text
}

func plainBundle(text string) Bundle {
	return Bundle{Data: map[string]any{MIMEPlain: text}, Metadata: map[string]any{}}
}

// pictureBundle has no html: where a document becomes a PDF, a picture is taken
// and html is not.
func pictureBundle(p *picture) Bundle {
	return Bundle{
		Data: map[string]any{
			MIMESVG:   string(p.svg()),
			MIMEPNG:   base64.StdEncoding.EncodeToString(p.png()),
			MIMEPlain: p.text,
		},
		Metadata: map[string]any{
			MIMEPNG: map[string]any{
				"alt":    p.description,
				"width":  int(math.Round(pixels(p.width))),
				"height": int(math.Round(pixels(p.height))),
			},
		},
	}
}
