package display

import (
	"bytes"
	"encoding/binary"
	"hash/crc32"
	"strings"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
	"gonum.org/v1/plot/vg/vgimg"

	"brinkline/display/internal/svg"
)

// A picture is a plot that is ready to be drawn on any canvas.
type picture struct {
	plot          *plot.Plot
	width, height vg.Length
	title         string   // for those who cannot see it, with the description
	description   string   // the facts in a sentence
	text          string   // the plain form of the whole
	notes         []string // lines under the plot
}

// draw puts the picture on a canvas of its size.
func (p *picture) draw(c vg.Canvas) {
	dc := draw.NewCanvas(c, p.width, p.height)
	dc.SetColor(plate)
	dc.Fill(dc.Rectangle.Path())
	below := p.drawNotes(dc)
	p.plot.Draw(draw.Crop(dc, cropLeft, -cropRight, cropBottom+below, -cropTop))
}

const notePitch = 10

// drawNotes writes the lines under the plot and returns the height they take.
func (p *picture) drawNotes(dc draw.Canvas) vg.Length {
	if len(p.notes) == 0 {
		return 0
	}
	f := face(noteSize)
	y := vg.Length(len(p.notes)-1)*notePitch + 4
	dc.SetColor(faint)
	for _, line := range p.notes {
		dc.FillString(f, vg.Point{X: 6, Y: y}, line)
		y -= notePitch
	}
	return vg.Length(len(p.notes))*notePitch + 4
}

// svg returns the picture as an SVG document.
func (p *picture) svg() []byte {
	c := svg.New(p.width, p.height)
	p.draw(c)
	return c.Document(p.title, p.description)
}

// png returns the picture with 144 dots to the inch.
func (p *picture) png() []byte {
	c := vgimg.NewWith(vgimg.UseWH(p.width, p.height), vgimg.UseDPI(rasterDPI), vgimg.UseBackgroundColor(plate))
	p.draw(raster{c})
	var out bytes.Buffer
	if _, err := (vgimg.PngCanvas{Canvas: c}).WriteTo(&out); err != nil {
		panic(err) // a buffer takes everything
	}
	return withResolution(out.Bytes(), rasterDPI)
}

// A raster canvas draws a square for a rune that the font lacks, where vgimg
// would draw nothing.
type raster struct{ *vgimg.Canvas }

func (r raster) FillString(f font.Face, at vg.Point, text string) {
	r.Canvas.FillString(f, at, boxed(text))
}

// withResolution puts the chunk pHYs behind the header of a PNG, so that a
// document shows the picture in its size (PNG specification, 11.3.5.3).
func withResolution(png []byte, dpi float64) []byte {
	const header = 8 + 4 + 4 + 13 + 4 // signature, then IHDR with its frame
	chunk := make([]byte, 0, 21)
	chunk = binary.BigEndian.AppendUint32(chunk, 9)
	chunk = append(chunk, "pHYs"...)
	perMetre := uint32(dpi/0.0254 + 0.5)
	chunk = binary.BigEndian.AppendUint32(chunk, perMetre)
	chunk = binary.BigEndian.AppendUint32(chunk, perMetre)
	chunk = append(chunk, 1)
	chunk = binary.BigEndian.AppendUint32(chunk, crc32.ChecksumIEEE(chunk[4:]))
	out := make([]byte, 0, len(png)+len(chunk))
	return append(append(append(out, png[:header]...), chunk...), png[header:]...)
}

// wrap breaks text into lines that fit a width.
func wrap(text string, size, width vg.Length) []string {
	f := face(size)
	var lines []string
	line := ""
	for _, word := range strings.Fields(text) {
		longer := strings.TrimSpace(line + " " + word)
		if line != "" && f.Width(longer) > width {
			lines = append(lines, line)
			longer = word
		}
		line = longer
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}
