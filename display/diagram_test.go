package display

import (
	"encoding/base64"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"brinkline/continuation"
)

// A diagram draws all of its branches, says how hard they were looked for, and has a
// table of the special points of all.
func TestDiagram(t *testing.T) {
	for name, d := range diagrams(t) {
		b := Render(d)
		svg, _ := b.Data[MIMESVG].(string)
		if !strings.Contains(svg, "<svg") || !strings.Contains(b.Text(), d.Statement()[1:]) {
			t.Errorf("%s: %d bytes of svg, text %q", name, len(svg), b.Text())
		}
		if text := Table(d).String(); !strings.Contains(text, "simple stationary bifurcation") && !strings.Contains(text, "fold") {
			t.Errorf("%s: table %s", name, text)
		}
		if dir := os.Getenv("BRINKLINE_GALLERY"); dir != "" {
			png, err := base64.StdEncoding.DecodeString(b.Data[MIMEPNG].(string))
			if err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(filepath.Join(dir, name+".png"), png, 0o644); err != nil {
				t.Fatal(err)
			}
			t.Log(Table(d))
		}
	}
	if err := Plot((*continuation.Diagram)(nil)).Err(); err == nil {
		t.Error("a nil diagram is drawn")
	}
}

func diagrams(t *testing.T) map[string]*continuation.Diagram {
	all := func(m *continuation.Model, parameter string, box continuation.Box) *continuation.Diagram {
		d, err := m.FollowAll(parameter, box, continuation.Effort(16))
		if err != nil {
			t.Fatal(err)
		}
		return d
	}
	bent := newModel(t, strut, strutParams{Load: 5}, continuation.Named("strut"))
	broken := newModel(t, strut, strutParams{Load: 5, Crookedness: 0.4}, continuation.Named("strut"))
	box := continuation.Box{"Load": {0, 20}, "Deflection": {-6, 6}}
	reactor := newModel(t, tank, tankParams{Inflow: 100, Coolant: 300, Feed: 350}, continuation.Named("tank"))
	return map[string]*continuation.Diagram{
		"diagram-strut":  all(bent, "Load", box),
		"diagram-broken": all(broken, "Load", box),
		"diagram-tank":   all(reactor, "Coolant", continuation.Box{"Coolant": {280, 320}, "Conversion": {0, 1}, "Temperature": {280, 450}}),
	}
}
