package tape

import (
	"reflect"
	"strings"
	"testing"
)

func TestFormulas(t *testing.T) {
	p := record(t, tank, Settings{Params: reflect.ValueOf(tankParams{0.1, 10, 2})})
	names := Names{States: []string{"X", "Y"}, Params: []string{"Da", "B", "Beta"}}
	tests := []struct {
		i    int
		by   string
		want string
	}{
		{0, "", "Da*(1 - X)*math.Exp(Y) - X"},
		{0, "X", "-1 - Da*math.Exp(Y)"},
		{0, "Y", "Da*(1 - X)*math.Exp(Y)"},
		{1, "X", "-(B*(Da*math.Exp(Y)))"},
		{1, "Y", "B*(Da*(1 - X)*math.Exp(Y)) - (Beta + 1)"},
		{1, "Da", "B*((1 - X)*math.Exp(Y))"},
		{0, "Beta", "0"},
	}
	for _, test := range tests {
		got, err := p.Formula(test.i, test.by, names)
		if err != nil || strings.ReplaceAll(got, "\n", "; ") != test.want {
			t.Errorf("equation %d by %q: %q, %v; want %q", test.i, test.by, got, err, test.want)
		}
	}
	if _, err := p.Formula(0, "Z", names); err == nil {
		t.Error("no error for an unknown name")
	}
}
