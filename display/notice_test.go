package display

import (
	"strings"
	"testing"

	"brinkline/continuation"
)

// TestNotice lets a model say something under all that was computed from it, also under
// a figure that was drawn before it had anything to say.
func TestNotice(t *testing.T) {
	text := ""
	m := newModel(t, tank, tankParams{Inflow: 100, Coolant: 300, Feed: 350}, continuation.Named("tank"),
		continuation.WithNotice(func() string { return text }))
	start := settle(t, m, tankState{0.1, 320})
	path := follow(t, start, "Coolant", continuation.Within(280, 320))
	fold := path.Folds()[0]
	margin, err := start.MarginTo(fold)
	if err != nil {
		t.Fatal(err)
	}
	sens, err := fold.Sensitivities()
	if err != nil {
		t.Fatal(err)
	}
	folds := locus(t, fold, "Inflow", continuation.Within(90, 110))
	figure := Plot(path)
	values := []any{m, start, path, fold, path.HopfPoints()[0], margin, sens, folds, folds.Points()[0], path.Folds(), Table(path),
		Points(path), Table(folds), figure, Eigenvalues(path), Mark(start, "today")}
	for _, v := range values {
		if strings.Contains(Render(v).Text(), "has changed") {
			t.Errorf("%T: a notice before there is one", v)
		}
	}
	text = "the definition of the model has changed since"
	for _, v := range []any{m, start, path, fold, path.HopfPoints()[0], margin, sens, folds, folds.Points()[0], path.Folds(), Table(path),
		Points(path), Table(folds), figure, Eigenvalues(path), Mark(start, "today")} {
		got := Render(v).Text()
		if strings.Count(got, "The definition of the model has changed since.") != 1 {
			t.Errorf("%T: no notice, or several, in\n%s", v, got)
		}
		if strings.Contains(got, caution) && !strings.HasSuffix(got, caution) {
			t.Errorf("%T: the caution does not end the card", v)
		}
	}
	if doc := Render(figure).Data[MIMESVG].(string); !strings.Contains(doc, "has changed since.</text>") {
		t.Error("the notice is not in the picture")
	}
}
