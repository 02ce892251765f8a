package logo

import (
	"bytes"
	"flag"
	"fmt"
	"image"
	"image/draw"
	"image/png"
	"math"
	"os"
	"testing"
)

var update = flag.Bool("update", false, "write the pictures anew")

// TestFilesAreWhatIsDrawn holds the embedded files to the drawing. Pixels are
// compared, since the bytes of a PNG depend on the version of its encoder.
func TestFilesAreWhatIsDrawn(t *testing.T) {
	for _, size := range []int{32, 64} {
		name := fmt.Sprintf("logo-%dx%d.png", size, size)
		want := Draw(size)
		if *update {
			var b bytes.Buffer
			if err := png.Encode(&b, want); err != nil {
				t.Fatal(err)
			}
			write(t, name, b.Bytes())
			continue
		}
		got := decode(t, name)
		for i := range want.Pix {
			if d := int(want.Pix[i]) - int(got.Pix[i]); d < -1 || d > 1 { // math differs in the last digit between processors
				t.Fatalf("%s: byte %d of the pixels is %d; drawn is %d", name, i, got.Pix[i], want.Pix[i])
			}
		}
	}
	if *update {
		write(t, "logo-svg.svg", []byte(SVG()))
		return
	}
	if got, _ := Files.ReadFile("logo-svg.svg"); string(got) != SVG() {
		t.Errorf("logo-svg.svg is\n%s\ndrawn is\n%s", got, SVG())
	}
}

func write(t *testing.T, name string, text []byte) {
	if err := os.WriteFile(name, text, 0o644); err != nil {
		t.Fatal(err)
	}
}

func decode(t *testing.T, name string) *image.NRGBA {
	text, err := Files.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	img, err := png.Decode(bytes.NewReader(text))
	if err != nil {
		t.Fatal(err)
	}
	n := image.NewNRGBA(img.Bounds())
	draw.Draw(n, n.Bounds(), img, image.Point{}, draw.Src)
	return n
}

// TestTheBranchTurns looks at the pixels that make the picture what it says.
func TestTheBranchTurns(t *testing.T) {
	img := Draw(64)
	for _, c := range []struct {
		what string
		x, y int
		want any
	}{
		{"fold", foldX, foldY, brink},
		{"stable end", foldX - reach, foldY - rise, ink},
		{"beyond the brink", 58, foldY, paper},
		{"between the halves", 20, foldY, paper},
		{"outside the corner", 0, 0, img.NRGBAAt(63, 63)},
	} {
		if got := img.NRGBAAt(c.x, c.y); got != c.want {
			t.Errorf("%s at (%d, %d): %v, want %v", c.what, c.x, c.y, got, c.want)
		}
	}
	dashes := 0
	for x := 10; x < foldX; x++ { // along the lower half
		y := int(foldY + rise*math.Sqrt((foldX-float64(x))/reach))
		if img.NRGBAAt(x, y) == paper && img.NRGBAAt(x-1, y) != paper {
			dashes++
		}
	}
	if dashes < 2 {
		t.Errorf("the unstable half has %d dashes; want several", dashes)
	}
}
