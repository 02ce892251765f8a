package logo

import (
	"fmt"
	"image"
	"image/color"
	"math"
	"strings"
)

// The picture is made on a square of 64 units. The branch is the parabola
//
//	x = foldX - reach ((y - foldY)/rise)²
//
// with its fold at (foldX, foldY).
const (
	side         = 64.0
	corner       = 12.0
	foldX, foldY = 48.0, 32.0
	reach, rise  = 38.0, 18.0
	stroke       = 5.0
	barHalf      = 12.0 // half the length of the fold's bar
	dash, gap    = 7.0, 8.0
)

var (
	paper = color.NRGBA{0xfb, 0xfa, 0xf5, 0xff}
	ink   = color.NRGBA{0x1b, 0x3a, 0x57, 0xff}
	brink = color.NRGBA{0xd5, 0x5e, 0x00, 0xff}
)

type point struct{ x, y float64 }

type segment struct{ a, b point }

// SVG returns the logo as a scalable picture.
func SVG() string {
	half := func(y float64) string { // half of the parabola is a quadratic Bézier curve
		return fmt.Sprintf("M%g %gQ%g %g %g %g", foldX, foldY, foldX, (foldY+y)/2, foldX-reach, y)
	}
	var b strings.Builder
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" width="64" height="64" viewBox="0 0 64 64" role="img">
<title>A branch that turns at a fold</title>
<rect width="64" height="64" rx="%g" fill="%s"/>
`, corner, hex(paper))
	fmt.Fprintf(&b, `<g fill="none" stroke="%s" stroke-width="%g" stroke-linecap="round">
<path d="%s"/>
<path d="%s" stroke-dasharray="%g %g"/>
<path d="M%g %gV%g" stroke="%s"/>
</g>
</svg>
`, hex(ink), stroke, half(foldY-rise), half(foldY+rise), dash, gap, foldX, foldY-barHalf, foldY+barHalf, hex(brink))
	return b.String()
}

func hex(c color.NRGBA) string { return fmt.Sprintf("#%02x%02x%02x", c.R, c.G, c.B) }

// branch returns the half of the parabola that runs from the fold to the height
// y, as short segments.
func branch(y float64) (s []segment) {
	at := func(t float64) point {
		return point{foldX - reach*t*t, foldY + t*(y-foldY)}
	}
	const n = 64
	for i := range n {
		s = append(s, segment{at(float64(i) / n), at(float64(i+1) / n)})
	}
	return s
}

// dashed keeps the segments that lie in dashes.
func dashed(s []segment) (kept []segment) {
	length := 0.0
	for _, g := range s {
		if math.Mod(length, dash+gap) < dash {
			kept = append(kept, g)
		}
		length += math.Hypot(g.b.x-g.a.x, g.b.y-g.a.y)
	}
	return kept
}

// distance returns how far p is from the segment.
func (s segment) distance(p point) float64 {
	dx, dy := s.b.x-s.a.x, s.b.y-s.a.y
	t := ((p.x-s.a.x)*dx + (p.y-s.a.y)*dy) / (dx*dx + dy*dy)
	t = math.Max(0, math.Min(1, t))
	return math.Hypot(p.x-s.a.x-t*dx, p.y-s.a.y-t*dy)
}

func near(p point, s []segment) bool {
	for _, g := range s {
		if g.distance(p) <= stroke/2 {
			return true
		}
	}
	return false
}

// Draw returns the logo with the given number of pixels a side.
func Draw(pixels int) *image.NRGBA {
	lines := append(branch(foldY-rise), dashed(branch(foldY+rise))...)
	bar := []segment{{point{foldX, foldY - barHalf}, point{foldX, foldY + barHalf}}}
	colour := func(p point) (c color.NRGBA) {
		switch {
		case near(p, bar):
			return brink
		case near(p, lines):
			return ink
		case inside(p):
			return paper
		}
		return color.NRGBA{}
	}
	img := image.NewNRGBA(image.Rect(0, 0, pixels, pixels))
	for y := range pixels {
		for x := range pixels {
			img.SetNRGBA(x, y, average(x, y, side/float64(pixels), colour))
		}
	}
	return img
}

// inside reports whether p is on the square with round corners.
func inside(p point) bool {
	q := point{math.Max(corner, math.Min(side-corner, p.x)), math.Max(corner, math.Min(side-corner, p.y))}
	return math.Hypot(p.x-q.x, p.y-q.y) <= corner
}

// average returns the mean colour of the pixel at (x, y), whose side is scale.
func average(x, y int, scale float64, colour func(point) color.NRGBA) color.NRGBA {
	const n = 8 // samples a side
	var r, g, b, a int
	for i := range n * n {
		c := colour(point{
			(float64(x) + (float64(i%n)+0.5)/n) * scale,
			(float64(y) + (float64(i/n)+0.5)/n) * scale,
		})
		if c.A != 0 {
			r, g, b, a = r+int(c.R), g+int(c.G), b+int(c.B), a+1
		}
	}
	if a == 0 {
		return color.NRGBA{}
	}
	return color.NRGBA{uint8(r / a), uint8(g / a), uint8(b / a), uint8(255 * a / (n * n))}
}
