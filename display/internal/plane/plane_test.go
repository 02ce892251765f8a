package plane

import (
	"math"
	"testing"

	"gonum.org/v1/plot/vg"
	"pgregory.net/rapid"
)

func randomLine(t *rapid.T, most int) []vg.Point {
	n := rapid.IntRange(2, most).Draw(t, "points")
	line := make([]vg.Point, n)
	for i := range line {
		line[i] = vg.Point{X: coordinate(t), Y: coordinate(t)}
	}
	return line
}

func coordinate(t *rapid.T) vg.Length {
	return vg.Length(rapid.Float64Range(-20, 420).Draw(t, "coordinate"))
}

func toLine(p vg.Point, line []vg.Point) vg.Length {
	least := vg.Length(math.Inf(1))
	for i := 1; i < len(line); i++ {
		least = min(least, Distance(p, line[i-1], line[i]))
	}
	return least
}

func TestThinStaysWithinTolerance(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		line := randomLine(t, 60)
		thin := Thin(line, 3)
		if thin[0] != line[0] || thin[len(thin)-1] != line[len(line)-1] {
			t.Fatal("an end moved")
		}
		for _, p := range line {
			if d := toLine(p, thin); d > 3+1.5+1e-9 { // the tolerance and what points near each other allow
				t.Fatalf("%v lies %v away", p, d)
			}
		}
	})
}

func TestThinDropsWhatIsNotFinite(t *testing.T) {
	nan := vg.Length(math.NaN())
	got := Thin([]vg.Point{{X: 0, Y: 0}, {X: nan, Y: 1}, {X: 10, Y: 0}}, 0.1)
	if len(got) != 2 {
		t.Errorf("%v", got)
	}
}

func TestThinManyPoints(t *testing.T) {
	line := make([]vg.Point, 100_000)
	for i := range line {
		a := 2 * math.Pi * float64(i) / float64(len(line)-1)
		line[i] = vg.Point{X: vg.Length(200 + 100*math.Cos(a)), Y: vg.Length(100 * math.Sin(a))}
	}
	if n := len(Thin(line, 0.05)); n > 150 {
		t.Errorf("a circle keeps %d points", n)
	}
}

// TestSmoothFollowsACircle compares Hermite pieces through points of a circle with
// the circle. The pieces of 30 degrees are off by at most 1.2e-4 of the radius.
func TestSmoothFollowsACircle(t *testing.T) {
	const r = 100
	var knots []Knot
	for k := range 13 {
		sin, cos := math.Sincos(float64(k) * math.Pi / 6)
		knots = append(knots, Knot{
			At:      vg.Point{X: vg.Length(r * cos), Y: vg.Length(r * sin)},
			Tangent: vg.Point{X: vg.Length(-7 * sin), Y: vg.Length(7 * cos)},
		})
	}
	for _, p := range Smooth(knots) {
		if d := math.Abs(math.Hypot(float64(p.X), float64(p.Y)) - r); d > 0.15 {
			t.Fatalf("%v is off by %g", p, d)
		}
	}
}

func TestSmoothIsStraightWithoutTangents(t *testing.T) {
	nan := vg.Length(math.NaN())
	got := Smooth([]Knot{{At: vg.Point{}, Tangent: vg.Point{X: nan, Y: nan}}, {At: vg.Point{X: 10, Y: 5}}})
	if len(got) != 2 {
		t.Errorf("%v", got)
	}
}

func TestClipStaysInside(t *testing.T) {
	frame := vg.Rectangle{Min: vg.Point{X: 0, Y: 0}, Max: vg.Point{X: 400, Y: 400}}
	rapid.Check(t, func(t *rapid.T) {
		line := randomLine(t, 30)
		pieces := Clip(line, frame)
		total := vg.Length(0)
		for _, piece := range pieces {
			for i, p := range piece {
				if !contains(grow(frame, 1e-9), p) {
					t.Fatalf("%v lies outside", p)
				}
				if d := toLine(p, line); d > 1e-9 {
					t.Fatalf("%v is not on the line", p)
				}
				if i > 0 {
					total += length(sub(p, piece[i-1]))
				}
			}
		}
		want := vg.Length(0)
		for i := 1; i < len(line); i++ {
			if a, b, ok := ClipSegment(line[i-1], line[i], frame); ok {
				want += length(sub(b, a))
			}
		}
		if math.Abs(float64(total-want)) > 1e-6 {
			t.Fatalf("length %v, want %v", total, want)
		}
	})
}

func TestUncoveredKeepsTheInk(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		line := randomLine(t, 80)
		pieces := Uncovered(line, 4)
		for _, p := range line {
			near := vg.Length(math.Inf(1))
			for _, piece := range pieces {
				near = min(near, toLine(p, piece))
			}
			if near > 4*math.Sqrt2 {
				t.Fatalf("no ink within a cell of %v: %v", p, near)
			}
		}
	})
}

// TestPlacedLabelsAreFree places labels among random lines and marks; none may lie
// on another, on a line or outside.
func TestPlacedLabelsAreFree(t *testing.T) {
	frame := vg.Rectangle{Min: vg.Point{X: 0, Y: 0}, Max: vg.Point{X: 400, Y: 250}}
	rapid.Check(t, func(t *rapid.T) {
		room := &Room{Frame: frame}
		for range rapid.IntRange(0, 4).Draw(t, "lines") {
			room.BlockLine(randomLine(t, 12))
		}
		var boxes []vg.Rectangle
		for range rapid.IntRange(1, 12).Draw(t, "labels") {
			anchor := vg.Point{X: vg.Length(rapid.Float64Range(0, 400).Draw(t, "x")), Y: vg.Length(rapid.Float64Range(0, 250).Draw(t, "y"))}
			size := vg.Point{X: vg.Length(rapid.Float64Range(10, 120).Draw(t, "w")), Y: 10}
			before := room.Copy()
			p, ok := room.Near(Request{Anchor: anchor, Size: size, Prefer: vg.Point{X: 1}, Reach: 4})
			if !ok {
				continue
			}
			if !inside(p.Box, frame) || before.crossings(p.Box) > 0 {
				t.Fatalf("%v lies on a line or outside", p.Box)
			}
			for _, b := range boxes {
				if Overlap(b, p.Box) {
					t.Fatalf("%v lies on %v", p.Box, b)
				}
			}
			boxes = append(boxes, p.Box)
			room.Take(p)
		}
	})
}

func TestNearPrefersTheWantedSide(t *testing.T) {
	room := &Room{Frame: vg.Rectangle{Max: vg.Point{X: 400, Y: 250}}}
	for _, side := range []vg.Point{{X: 1}, {X: -1}, {Y: 1}, {Y: -1}} {
		p, ok := room.Near(Request{Anchor: vg.Point{X: 200, Y: 100}, Size: vg.Point{X: 50, Y: 10}, Prefer: side, Reach: 4})
		c := vg.Point{X: (p.Box.Min.X+p.Box.Max.X)/2 - 200, Y: (p.Box.Min.Y+p.Box.Max.Y)/2 - 100}
		if !ok || p.Leader != nil || dot(c, side) < 8 {
			t.Errorf("side %v: %v", side, p)
		}
	}
}

func TestSpotIsTheEmptiest(t *testing.T) {
	room := &Room{Frame: vg.Rectangle{Max: vg.Point{X: 400, Y: 250}}}
	size := vg.Point{X: 80, Y: 40}
	room.BlockLine([]vg.Point{{X: 300, Y: 240}, {X: 400, Y: 240}}) // top right
	room.BlockLine([]vg.Point{{X: 0, Y: 240}, {X: 100, Y: 240}})   // top left
	room.Block(vg.Rectangle{Max: vg.Point{X: 50, Y: 50}})          // bottom left
	box, ok := room.Spot(size)
	if !ok || box.Max.X < 390 || box.Min.Y > 10 {
		t.Errorf("%v, %v", box, ok)
	}
	for _, x := range []vg.Length{0, 350} {
		for _, y := range []vg.Length{0, 200} {
			room.Block(vg.Rectangle{Min: vg.Point{X: x, Y: y}, Max: vg.Point{X: x + 50, Y: y + 50}})
		}
	}
	if box, ok = room.Spot(size); !ok || room.taken(box) || room.crossings(box) > 0 {
		t.Errorf("with labels in all corners: %v, %v", box, ok)
	}
	room.Block(room.Frame)
	if _, ok = room.Spot(size); ok {
		t.Error("a place was found where there is none")
	}
}
