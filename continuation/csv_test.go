package continuation_test

import (
	"bytes"
	"math"
	"reflect"
	"slices"
	"strings"
	"testing"

	"brinkline/continuation"
)

// Branches of all cases of the literature come back from a file to the last bit, with their
// special points refined anew.
func TestBranchesComeBackFromCSV(t *testing.T) {
	for _, c := range cases(t) {
		t.Run(c.ID, func(t *testing.T) {
			b := follow(t, c)
			var file bytes.Buffer
			if err := b.WriteCSV(&file); err != nil {
				t.Fatal(err)
			}
			text := file.String()
			back, err := b.Model().ReadBranch(&file)
			if err != nil {
				t.Fatal(err)
			}
			if len(back.Points()) != len(b.Points()) || back.Start() != b.Start() {
				t.Fatalf("%d points from %d, want %d from %d", len(back.Points()), back.Start(), len(b.Points()), b.Start())
			}
			for i, p := range b.Points() {
				q := back.Points()[i]
				if !slices.Equal(p.State, q.State) || !slices.Equal(p.Parameters, q.Parameters) || p.Unstable != q.Unstable || !slices.Equal(p.Tangent, q.Tangent) {
					t.Fatalf("point %d: %v became %v", i, p, q)
				}
			}
			for i, s := range b.Specials() {
				sameAsRead(t, s, back.Specials()[i])
			}
			var again bytes.Buffer
			if err := back.WriteCSV(&again); err != nil || again.String() != text {
				t.Errorf("a second file differs (%v)", err)
			}
		})
	}
}

func sameAsRead(t *testing.T, a, b continuation.Special) {
	t.Helper()
	if reflect.TypeOf(a) != reflect.TypeOf(b) || a.Index() != b.Index() || a.Where().Value() != b.Where().Value() {
		t.Errorf("%v became %v", a, b)
	}
	if f, ok := a.(*continuation.Fold); ok {
		if g := b.(*continuation.Fold); math.Abs(g.Curvature-f.Curvature) > 1e-4*math.Abs(f.Curvature) {
			t.Errorf("curvature %g became %g", f.Curvature, g.Curvature)
		}
	}
}

func TestFamilyComesBackFromCSV(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	f, err := start.Sweep("Coolant", "Inflow", []float64{90, 110}, continuation.Within(260, 330))
	if err != nil {
		t.Fatal(err)
	}
	var file bytes.Buffer
	if err := f.WriteCSV(&file); err != nil {
		t.Fatal(err)
	}
	if head, _, _ := strings.Cut(file.String(), "\n"); !strings.HasPrefix(head, "branch number,Coolant (K),Inflow (L/min),Conversion,Temperature (K),") {
		t.Errorf("header %s", head)
	}
	back, err := start.Model().ReadFamily(&file, "Inflow")
	if err != nil {
		t.Fatal(err)
	}
	if len(back.Members()) != 2 || back.Members()[1].Value != 110 || len(back.Branches()[1].Folds()) != 2 || back.Parameter().Name != "Coolant" {
		t.Errorf("%v", back)
	}
}

func TestLocusComesBackFromCSV(t *testing.T) {
	start := settled(t, newTank(t), tankState{0.1, 310})
	fold := mustFollow(t, start, "Coolant", continuation.Within(260, 330)).Folds()[0]
	l, err := fold.Follow("Inflow", continuation.Within(60, 150))
	if err != nil {
		t.Fatal(err)
	}
	var file bytes.Buffer
	if err := l.WriteCSV(&file); err != nil {
		t.Fatal(err)
	}
	back, err := start.Model().ReadLocus(&file, "fold")
	if err != nil {
		t.Fatal(err)
	}
	if len(back.Points()) != len(l.Points()) || back.First().Name != "Coolant" || len(back.Specials()) != len(l.Specials()) {
		t.Errorf("%v, want %v", back, l)
	}
	for i, p := range l.Points() {
		if q := back.Points()[i]; p.First != q.First || p.Second != q.Second || !slices.Equal(p.State[:2], q.State) {
			t.Fatalf("point %d: %v became %v", i, p, q)
		}
	}
}

func TestBadCSV(t *testing.T) {
	m := newTank(t)
	b := mustFollow(t, settled(t, m, tankState{0.1, 310}), "Coolant", continuation.Within(275, 285))
	var file bytes.Buffer
	if err := b.WriteCSV(&file); err != nil {
		t.Fatal(err)
	}
	text := file.String()
	for _, c := range []struct{ name, old, new, want string }{
		{"unit", "Temperature (K)", "Temperature (C)", `but Temperature of the model is in K: convert the values and mend the header`},
		{"no unit", "Temperature (K)", "Temperature", `has no unit in its header; write "Temperature (K)"`},
		{"column", "Temperature (K)", "Heat (K)", `no column "Temperature (K)"`},
		{"twice", "Conversion", "Temperature (K)", "two columns are named Temperature (K)"},
		{"followed", "Coolant (K)", "Colant (K)", "did you mean Coolant?"},
		{"number", "start", "start\n280,x", "row"},
		{"no start", "start", "", "no row has the remark start"},
		{"point", "280,", "281,", "is no steady state of model tank"},
	} {
		_, err := m.ReadBranch(strings.NewReader(strings.Replace(text, c.old, c.new, 1)))
		if c.name == "number" {
			oneLine(t, err, "wrong number of fields")
			continue
		}
		oneLine(t, err, c.want)
	}
	_, err := m.ReadBranch(strings.NewReader(""))
	oneLine(t, err, "the first line names the columns")
	_, err = newBus(t).Model().ReadBranch(strings.NewReader(text))
	oneLine(t, err, `no parameter "Coolant"`)
	_, err = m.ReadFamily(strings.NewReader(text), "Inflow")
	oneLine(t, err, "no file of a family")
	_, err = m.ReadLocus(strings.NewReader(text), "knot")
	oneLine(t, err, "it must be fold or Hopf point")
}
