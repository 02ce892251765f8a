package display

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func TestCardGallery(t *testing.T) {
	dir := os.Getenv("BRINKLINE_GALLERY")
	if dir == "" {
		t.Skip("set BRINKLINE_GALLERY to a folder to write the cards there")
	}
	var page, text strings.Builder
	page.WriteString(`<body style="font:13px sans-serif;columns:2">`)
	for _, v := range cards(t) {
		b := Render(v)
		if html, ok := b.Data[MIMEHTML].(string); ok {
			page.WriteString(html + "<hr>")
		}
		fmt.Fprintf(&text, "%s\n\n", b.Text())
	}
	for name, data := range map[string]string{"cards.html": page.String(), "cards.txt": text.String()} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(data), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

func cards(t testing.TB) []any {
	path := tankBranch(t)
	fold := path.Folds()[0]
	start := path.Points()[path.Start()]
	margin, err := start.MarginTo(fold)
	if err != nil {
		t.Fatal(err)
	}
	sens, err := fold.Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	feed := feederBranch(t)
	return []any{
		path.Model(), start, tankStart(t), fold, path.HopfPoints()[0], strutBranch(t).BranchPoints()[0], margin, sens,
		Table(path), path.Folds(), Points(path), path, feed.Model(), feed.Folds()[0], Table(feed), feed, Points(feed.Points()[:5]),
		Table(strutBranch(t)), Table(map[string]float64{"a": 1, "b": 2.5}), Table([]struct {
			Name string
			Heat float64 `unit:"kW"`
		}{{"north", 1.25}, {"south", 1250}}),
	}
}
