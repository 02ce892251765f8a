package display

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"brinkline/continuation"
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
	_, folds, hopfs := tankLoci(t)
	rocker := takens(t, -1)
	double := locus(t, rocker.Folds()[0], "Lever", continuation.Within(-3, 3))
	list := []any{}
	for _, c := range folds.Specials() {
		list = append(list, c)
	}
	return append(list,
		path.Model(), start, tankStart(t), fold, path.HopfPoints()[0], strutBranch(t).BranchPoints()[0], margin, sens,
		Table(path), path.Folds(), Points(path), path, feed.Model(), feed.Folds()[0], Table(feed), feed, Points(feed.Points()[:5]),
		Table(folds), folds.Specials(), Points(folds), Points(hopfs), Table(hopfs), folds, hopfs.Points()[2],
		double.Specials()[0], hopfHopf(t).Specials()[0], foldHopf(t).Specials()[0], degenerateLocus(t).Specials()[0],
		degenerate(t, 1).HopfPoints()[0], transcritical(t)[0].BranchPoints()[0], hotTank(t).Events()[0],
		Table(strutBranch(t)), Table(map[string]float64{"a": 1, "b": 2.5}), Table([]struct {
			Name string
			Heat float64 `unit:"kW"`
		}{{"north", 1.25}, {"south", 1250}}))
}
