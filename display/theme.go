package display

import (
	"image/color"

	"gonum.org/v1/plot"
	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/text"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/draw"
)

var (
	plate = color.NRGBA{0xff, 0xff, 0xff, 0xff} // an opaque ground: pages may be dark
	ink   = color.NRGBA{0x22, 0x22, 0x22, 0xff}
	faint = color.NRGBA{0x66, 0x66, 0x66, 0xff}
	// accent marks folds, and nothing else has this hue.
	accent = color.NRGBA{0xd5, 0x5e, 0x00, 0xff}
)

// inks tell branches apart. They are the colours of Okabe & Ito (Color Universal
// Design, 2008), which readers with any common colour blindness can tell apart,
// without the vermilion of the folds and the yellow that is too light on paper.
var inks = []color.NRGBA{
	ink,
	{0x00, 0x72, 0xb2, 0xff}, // blue
	{0x00, 0x9e, 0x73, 0xff}, // bluish green
	{0xcc, 0x79, 0xa7, 0xff}, // reddish purple
	{0xe6, 0x9f, 0x00, 0xff}, // orange
	{0x56, 0xb4, 0xe9, 0xff}, // sky blue
}

// darker returns an ink for text: thin strokes need more contrast than lines.
func darker(clr color.Color) color.Color {
	n := color.NRGBAModel.Convert(clr).(color.NRGBA)
	part := func(v uint8) uint8 { return uint8(uint16(v) * 7 / 10) }
	return color.NRGBA{part(n.R), part(n.G), part(n.B), n.A}
}

const (
	lineWidth   = 1.5
	fineWidth   = 0.9
	hairWidth   = 0.6
	barWidth    = 3.0
	axisWidth   = 0.75
	bodySize    = 9.0 // axis labels, legend, title
	labelSize   = 8.0 // tick labels, labels of special points
	noteSize    = 7.5
	cropRight   = 9.0 // room for the last tick label
	cropTop     = 6.0
	cropLeft    = 2.0
	cropBottom  = 2.0
	rasterDPI   = 144
	usualWidth  = 14.0 // cm
	usualHeight = 9.0
)

var (
	dashes = []vg.Length{5, 3}
	dots   = []vg.Length{1.5, 2.5}

	dashesAndDots = []vg.Length{7, 2.5, 1.5, 2.5}
	fineDashes    = []vg.Length{3, 2}
)

// face returns the sans-serif face of that size, whose metrics lay out pictures.
func face(size vg.Length) font.Face {
	return font.DefaultCache.Lookup(sans, size)
}

var sans = font.Font{Typeface: "Liberation", Variant: "Sans"}

func textStyle(size vg.Length, clr color.Color, x draw.XAlignment, y draw.YAlignment) text.Style {
	return text.Style{Color: clr, Font: font.From(sans, size), XAlign: x, YAlign: y, Handler: plot.DefaultTextHandler}
}

// newPlot returns a plot in our style: axes left and below that meet, no grid.
func newPlot() *plot.Plot {
	p := plot.New()
	p.BackgroundColor = plate
	p.Title.TextStyle = textStyle(bodySize+1, ink, draw.XCenter, draw.YTop)
	p.Title.Padding = 5
	for _, a := range []*plot.Axis{&p.X, &p.Y} {
		a.Padding = 0
		a.LineStyle = draw.LineStyle{Color: ink, Width: axisWidth}
		a.Tick.LineStyle = a.LineStyle
		a.Tick.Length = 4
		a.Label.TextStyle = textStyle(bodySize, ink, draw.XCenter, draw.YBottom)
		a.Label.Padding = 4
	}
	p.X.Tick.Label = textStyle(labelSize, ink, draw.XCenter, draw.YTop)
	p.Y.Tick.Label = textStyle(labelSize, ink, draw.XRight, draw.YCenter)
	return p
}

// pixels turns points into pixels of a page on a screen, 96 to the inch.
func pixels(l vg.Length) float64 { return l.Points() * 96 / 72 }
