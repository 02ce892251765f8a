package svg

import (
	"bytes"
	"encoding/xml"
	"image"
	"image/color"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/plot/font"
	"gonum.org/v1/plot/font/liberation"
	"gonum.org/v1/plot/vg"
	"pgregory.net/rapid"
)

var sans = font.NewCache(liberation.Collection()).Lookup(font.Font{Typeface: "Liberation", Variant: "Sans"}, 10)

// element is what a test asks of an XML element.
type element struct {
	name string
	attr map[string]string
	text string
}

func elements(t testing.TB, doc []byte) []element {
	t.Helper()
	var list []element
	dec := xml.NewDecoder(bytes.NewReader(doc))
	for {
		tok, err := dec.Token()
		if err == io.EOF {
			return list
		}
		if err != nil {
			t.Fatalf("not XML: %v\n%s", err, doc)
		}
		switch tok := tok.(type) {
		case xml.StartElement:
			e := element{tok.Name.Local, map[string]string{}, ""}
			for _, a := range tok.Attr {
				e.attr[a.Name.Local] = a.Value
			}
			list = append(list, e)
		case xml.CharData:
			if len(list) > 0 {
				list[len(list)-1].text += strings.TrimSpace(string(tok))
			}
		}
	}
}

func TestDocument(t *testing.T) {
	c := New(360, 180)
	c.FillString(sans, vg.Point{X: 10, Y: 20}, "a < b & c")
	doc := c.Document("title & more", "what it shows")
	list := elements(t, doc)
	if list[0].name != "svg" || list[0].attr["role"] != "img" || list[0].attr["viewBox"] != "0 0 360 180" {
		t.Errorf("svg element: %v", list[0])
	}
	if list[0].attr["width"] != "480" || list[0].attr["height"] != "240" {
		t.Errorf("size in pixels: %v", list[0].attr)
	}
	if list[1].name != "title" || list[1].text != "title & more" || list[2].name != "desc" {
		t.Errorf("title and desc must come first: %v", list[1:3])
	}
	for _, id := range []string{list[1].attr["id"], list[2].attr["id"]} {
		if !strings.Contains(list[0].attr["aria-labelledby"], id) || !regexp.MustCompile(`^b[0-9a-f]{10}-`).MatchString(id) {
			t.Errorf("id %q", id)
		}
	}
	text := list[3]
	width, _ := strconv.ParseFloat(text.attr["textLength"], 64)
	if text.text != "a < b & c" || math.Abs(width-sans.Width("a < b & c").Points()) > 0.005 {
		t.Errorf("text: %v", text)
	}
	if text.attr["x"] != "10" || text.attr["y"] != "160" {
		t.Errorf("text stands at %s, %s", text.attr["x"], text.attr["y"])
	}
}

func TestIdentifiersFollowContent(t *testing.T) {
	draw := func(text string) string {
		c := New(100, 100)
		c.FillString(sans, vg.Point{}, text)
		return string(c.Document("t", "d"))
	}
	if first, again := draw("one"), draw("one"); first != again {
		t.Error("the same drawing gives other bytes")
	}
	id := regexp.MustCompile(`id="([^"]*)"`)
	if id.FindString(draw("one")) == id.FindString(draw("two")) {
		t.Error("two drawings share an id")
	}
}

func TestControlCharactersAreDropped(t *testing.T) {
	c := New(100, 100)
	c.FillString(sans, vg.Point{}, "a\x00b\x1bc\xff")
	elements(t, c.Document("\x01", "\x02"))
}

// TestTransforms compares paths under nested transforms with the points worked
// out by hand.
func TestTransforms(t *testing.T) {
	c := New(100, 100)
	c.Push()
	c.Translate(vg.Point{X: 10, Y: 20})
	c.Rotate(math.Pi / 2)
	c.Scale(2, 2)
	var p vg.Path
	p.Move(vg.Point{X: 0, Y: 0})
	p.Line(vg.Point{X: 5, Y: 0}) // 10 up from (10, 20)
	c.Stroke(p)
	c.FillString(sans, vg.Point{X: 0, Y: 0}, "up")
	c.Pop()
	c.Stroke(p)
	list := elements(t, c.Document("", ""))
	if got := list[3].attr["d"]; got != "M10 80L10 70" {
		t.Errorf("turned path: %q", got)
	}
	if list[3].attr["stroke-width"] != "2" {
		t.Errorf("width under scale: %v", list[3].attr)
	}
	if got := list[4].attr; got["transform"] != "rotate(-90 10 80)" || got["font-size"] != "20" {
		t.Errorf("turned text: %v", got)
	}
	if got := list[5].attr["d"]; got != "M0 100L5 100" {
		t.Errorf("after Pop: %q", got)
	}
}

// TestCircle checks that the cubic pieces of a circle keep its radius.
func TestCircle(t *testing.T) {
	c := New(100, 100)
	var p vg.Path
	p.Move(vg.Point{X: 70, Y: 50})
	p.Arc(vg.Point{X: 50, Y: 50}, 20, 0, 2*math.Pi)
	p.Close()
	c.Fill(p)
	d := elements(t, c.Document("", ""))[3].attr["d"]
	if strings.Count(d, "C") != 4 || !strings.HasSuffix(d, "Z") {
		t.Fatalf("circle: %q", d)
	}
	for _, piece := range strings.Split(strings.TrimSuffix(d, "Z"), "C")[1:] {
		n := coordinates(piece)
		if r := math.Hypot(n[4]-50, n[5]-50); math.Abs(r-20) > 0.02 {
			t.Errorf("end of a quarter at radius %g", r)
		}
	}
}

func coordinates(d string) []float64 {
	var list []float64
	for _, text := range regexp.MustCompile(`-?[0-9.]+`).FindAllString(d, -1) {
		v, _ := strconv.ParseFloat(text, 64)
		list = append(list, v)
	}
	return list
}

// TestPathsKeepTheirPoints checks that what is written lies within a twentieth of
// a point of what was drawn, both ways.
func TestPathsKeepTheirPoints(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 30).Draw(t, "points")
		var p vg.Path
		for i := range n {
			at := vg.Point{
				X: vg.Length(rapid.Float64Range(-50, 150).Draw(t, "x")),
				Y: vg.Length(rapid.Float64Range(-50, 150).Draw(t, "y")),
			}
			if i == 0 {
				p.Move(at)
			} else {
				p.Line(at)
			}
		}
		c := New(100, 100)
		got := coordinates(c.pathData(p, true))
		if len(got)%2 != 0 || len(got) < 4 {
			t.Fatalf("coordinates: %v", got)
		}
		for _, q := range p {
			near := math.Inf(1)
			for i := 3; i < len(got); i += 2 {
				near = min(near, toSegment(q.Pos.X.Points(), 100-q.Pos.Y.Points(), got[i-3:i+1]))
			}
			if near > 0.1 {
				t.Fatalf("%v lies %g away from %v", q.Pos, near, got)
			}
		}
	})
}

func toSegment(x, y float64, s []float64) float64 {
	dx, dy := s[2]-s[0], s[3]-s[1]
	u := 0.0
	if n := dx*dx + dy*dy; n > 0 {
		u = min(max(((x-s[0])*dx+(y-s[1])*dy)/n, 0), 1)
	}
	return math.Hypot(x-s[0]-u*dx, y-s[1]-u*dy)
}

func TestImageIsInTheFile(t *testing.T) {
	c := New(100, 100)
	img := image.NewNRGBA(image.Rect(0, 0, 2, 2))
	img.Set(0, 0, color.White)
	c.DrawImage(vg.Rectangle{Min: vg.Point{X: 10, Y: 10}, Max: vg.Point{X: 30, Y: 40}}, img)
	e := elements(t, c.Document("", ""))[3]
	if !strings.HasPrefix(e.attr["href"], "data:image/png;base64,") || e.attr["y"] != "60" || e.attr["height"] != "30" {
		t.Errorf("image: %v", e.attr)
	}
}
