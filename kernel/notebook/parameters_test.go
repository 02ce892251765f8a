package notebook

import (
	"testing"
)

func TestSetParametersAddsACellAfterTheTaggedOne(t *testing.T) {
	nb := cells(t, "a", "Inflow := 100.0 #parameters", "b")
	for _, inflow := range []string{"120", "130"} { // the second run replaces the first one's cell
		if err := nb.SetParameters([]string{"Inflow=" + inflow, `plant.Name["a=b"] = "x y"`}); err != nil {
			t.Fatal(err)
		}
		if len(nb.Cells) != 4 {
			t.Fatalf("%d cells", len(nb.Cells))
		}
		added := nb.Cells[2]
		want := "// values set when the notebook was run\nInflow = " + inflow + "\n" + `plant.Name["a=b"] = "x y"`
		if added.Source() != want || added.ID() != "injected-parameters" || !added.Tagged("injected-parameters") {
			t.Errorf("added %q, id %q", added.Source(), added.ID())
		}
	}
}

func TestSetParametersWithoutSettingsChangesNothing(t *testing.T) {
	nb := mustRead(t, reference)
	if err := nb.SetParameters(nil); err != nil || nb.Changed() {
		t.Errorf("changed, or %v", err)
	}
}

func TestSetParametersRefuses(t *testing.T) {
	const write = ": write it as name=value, with the value as in Go"
	for _, c := range []struct{ setting, want string }{
		{"Inflow", `can't set "Inflow"` + write},
		{"Inflow:=1", `can't set "Inflow:=1"` + write},
		{"Inflow=1; stop()", `can't set "Inflow=1; stop()"` + write},
		{"x=1 }; func f() { y=1", `can't set "x=1 }; func f() { y=1"` + write},
		{"Inflow=much water", `can't set "Inflow=much water"` + write},
		{"a, b = 1, 2", `can't set "a, b = 1, 2"` + write},
		{"", `can't set ""` + write},
		{"x=1", `no cell carries the tag "parameters", so there is nothing to set; tag the cell that holds the parameters`},
	} {
		nb := cells(t, "a")
		err := nb.SetParameters([]string{c.setting})
		if err == nil || err.Error() != c.want {
			t.Errorf("got %v\nwant %s", err, c.want)
		}
		if len(nb.Cells) != 1 {
			t.Error("a cell was added all the same")
		}
	}
}
