// Package svg draws gonum plots as scalable vector graphics that a notebook, a
// report and a paper can use as they are: text stays text, its width is the one
// that the layout was made with, nothing outside is referred to, and the same
// drawing gives the same bytes.
package svg

import (
	"bytes"
	"encoding/base64"
	"fmt"
	"image"
	"image/color"
	"image/png"
	"math"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/vg"
)

// A Canvas is a vg.Canvas that writes SVG elements. Coordinates are in points
// with the origin at the bottom left, as everywhere in vg; the file has its
// origin at the top left.
type Canvas struct {
	width, height vg.Length
	body          bytes.Buffer
	pen           pen
	saved         []pen
}

// A pen is what Push saves: the drawing state.
type pen struct {
	color  color.Color
	width  vg.Length
	dashes []vg.Length
	offset vg.Length
	matrix matrix
}

// New returns an empty canvas.
func New(width, height vg.Length) *Canvas {
	c := &Canvas{width: width, height: height}
	c.pen.matrix = identity
	vg.Initialize(c)
	return c
}

// Size returns the size of the canvas.
func (c *Canvas) Size() (width, height vg.Length) { return c.width, c.height }

// SetLineWidth sets the width of strokes; nothing is stroked at 0.
func (c *Canvas) SetLineWidth(w vg.Length) { c.pen.width = w }

// SetLineDash sets the lengths of dashes and gaps.
func (c *Canvas) SetLineDash(dashes []vg.Length, offset vg.Length) {
	c.pen.dashes, c.pen.offset = dashes, offset
}

// SetColor sets the colour of strokes, fills and text; nil is black.
func (c *Canvas) SetColor(clr color.Color) {
	if clr == nil {
		clr = color.Black
	}
	c.pen.color = clr
}

// Rotate turns what is drawn from now on, in radians counterclockwise.
func (c *Canvas) Rotate(rad float64) {
	sin, cos := math.Sincos(rad)
	c.pen.matrix = c.pen.matrix.after(matrix{cos, sin, -sin, cos, 0, 0})
}

// Translate moves what is drawn from now on.
func (c *Canvas) Translate(p vg.Point) {
	c.pen.matrix = c.pen.matrix.after(matrix{1, 0, 0, 1, p.X.Points(), p.Y.Points()})
}

// Scale stretches what is drawn from now on.
func (c *Canvas) Scale(x, y float64) {
	c.pen.matrix = c.pen.matrix.after(matrix{x, 0, 0, y, 0, 0})
}

// Push saves the drawing state and Pop restores it.
func (c *Canvas) Push() { c.saved = append(c.saved, c.pen) }

// Pop restores the drawing state that the last Push saved.
func (c *Canvas) Pop() {
	last := len(c.saved) - 1
	c.pen, c.saved = c.saved[last], c.saved[:last]
}

// Stroke draws the outline of a path.
func (c *Canvas) Stroke(path vg.Path) {
	if c.pen.width <= 0 {
		return
	}
	d := c.pathData(path, len(c.pen.dashes) == 0)
	if d == "" {
		return
	}
	fmt.Fprintf(&c.body, `<path d="%s" fill="none" stroke="%s"`, d, rgb(c.pen.color))
	c.opacity("stroke-opacity")
	scale := vg.Length(c.pen.matrix.scale())
	fmt.Fprintf(&c.body, ` stroke-width="%s"`, number(c.pen.width*scale))
	if len(c.pen.dashes) > 0 {
		fmt.Fprintf(&c.body, ` stroke-dasharray="%s"`, numbers(c.pen.dashes, scale))
		if c.pen.offset != 0 {
			fmt.Fprintf(&c.body, ` stroke-dashoffset="%s"`, number(c.pen.offset*scale))
		}
	}
	c.body.WriteString("/>\n")
}

// Fill fills a path.
func (c *Canvas) Fill(path vg.Path) {
	d := c.pathData(path, false)
	if d == "" {
		return
	}
	fmt.Fprintf(&c.body, `<path d="%s" fill="%s"`, d, rgb(c.pen.color))
	c.opacity("fill-opacity")
	c.body.WriteString("/>\n")
}

// FillString writes text with its baseline beginning at a point. The width that
// the font's metrics give is written along, so that the text fills the place it
// was given whatever font the reader has.
func (c *Canvas) FillString(face font.Face, at vg.Point, text string) {
	if text == "" || face.Font.Size <= 0 {
		return
	}
	m := c.pen.matrix
	x, y := m.apply(at.X.Points(), at.Y.Points())
	y = c.height.Points() - y
	scale := vg.Length(m.scale())
	fmt.Fprintf(&c.body, `<text x="%s" y="%s"`, float(x), float(y))
	if angle := m.angle(); math.Abs(angle) > 1e-9 {
		fmt.Fprintf(&c.body, ` transform="rotate(%s %s %s)"`, float(-angle*180/math.Pi), float(x), float(y))
	}
	fmt.Fprintf(&c.body, ` font-size="%s" textLength="%s" lengthAdjust="spacingAndGlyphs" fill="%s"`,
		number(face.Font.Size*scale), number(face.Width(text)*scale), rgb(c.pen.color))
	c.opacity("fill-opacity")
	if family, ok := families[face.Font.Variant]; ok {
		fmt.Fprintf(&c.body, ` font-family="%s"`, family)
	}
	if face.Font.Weight > 0 {
		c.body.WriteString(` font-weight="bold"`)
	}
	fmt.Fprintf(&c.body, ">%s</text>\n", Escape(text))
}

// DrawImage draws a picture into a rectangle; its bytes are part of the file.
func (c *Canvas) DrawImage(rect vg.Rectangle, img image.Image) {
	var raw bytes.Buffer
	if err := png.Encode(&raw, img); err != nil {
		return // only a picture without pixels cannot be encoded
	}
	m := c.pen.matrix
	x0, y0 := m.apply(rect.Min.X.Points(), rect.Max.Y.Points())
	x1, y1 := m.apply(rect.Max.X.Points(), rect.Min.Y.Points())
	fmt.Fprintf(&c.body, `<image x="%s" y="%s" width="%s" height="%s" preserveAspectRatio="none" href="data:image/png;base64,%s"/>`+"\n",
		float(x0), float(c.height.Points()-y0), float(x1-x0), float(y0-y1), base64.StdEncoding.EncodeToString(raw.Bytes()))
}

// families are those of faces other than the sans-serif one of the document.
var families = map[font.Variant]string{
	"Serif": "Times New Roman, Times, Liberation Serif, serif",
	"Mono":  "Courier New, Courier, Liberation Mono, monospace",
}

func (c *Canvas) opacity(attribute string) {
	_, _, _, a := c.pen.color.RGBA()
	if a < 0xffff {
		fmt.Fprintf(&c.body, ` %s="%s"`, attribute, float(float64(a)/0xffff))
	}
}

// rgb writes a colour without its opacity.
func rgb(clr color.Color) string {
	n := color.NRGBAModel.Convert(clr).(color.NRGBA)
	short := func(v uint8) bool { return v>>4 == v&15 }
	if short(n.R) && short(n.G) && short(n.B) {
		return fmt.Sprintf("#%x%x%x", n.R&15, n.G&15, n.B&15)
	}
	return fmt.Sprintf("#%02x%02x%02x", n.R, n.G, n.B)
}
