package help

import "testing"

func TestOn(t *testing.T) {
	for _, c := range []struct {
		source, name string
		ok           bool
	}{
		{"math.Sin?", "math.Sin", true},
		{" ?plant\n", "plant", true},
		{"λ_1?", "λ_1", true},
		{"plant", "", false},
		{"?plant?", "", false},
		{"x?y", "", false},
		{"f()?", "", false},
		{"?", "", false},
		{"1x?", "", false},
	} {
		if name, ok := On(c.source); name != c.name || ok != c.ok {
			t.Errorf("%q: %q, %v", c.source, name, ok)
		}
	}
}
