package session

import (
	"strings"
	"testing"
)

// shown runs a cell and returns the plain text of its value.
func shown(t *testing.T, s *Session, number int, source string) string {
	t.Helper()
	res := s.Run(t.Context(), Cell{Number: number, Source: source}, &recorder{})
	if res.Err != nil {
		t.Fatal(strings.Join(res.Err.Traceback, "\n"))
	}
	if res.Value == nil {
		return ""
	}
	return res.Value.Text()
}

func TestModelOfACellIsExact(t *testing.T) {
	s := sessionAfter(t, tankCells, "plant := continuation.NewModel(tank, Params{100, 280})")
	if text := shown(t, s, 3, "plant"); !strings.Contains(text, "exact, from the source:") {
		t.Errorf("the model's card says\n%s", text)
	}
}

func TestModelReadsASessionVariable(t *testing.T) {
	s := sessionAfter(t, `
type S struct{ X float64 }
type P struct{ L float64 }
rate := 2.0
func decay(s S, q P) S { return S{q.L - rate*s.X} }
m := continuation.NewModel(decay, P{4})
`)
	if text := shown(t, s, 2, "m"); !strings.Contains(text, "reads rate") {
		t.Errorf("the model's card says\n%s", text)
	}
	if text := shown(t, s, 3, `m.Settle(S{1}).At("X")`); text != "2" {
		t.Errorf("X = %s, want 2", text)
	}
	if text := shown(t, s, 4, "rate = 8\nm.Settle(S{1}).At(\"X\")"); text != "0.5" {
		t.Errorf("with another rate X = %s, want 0.5", text)
	}
}

func TestModelThatCannotBeRecordedSaysWhyAndWhere(t *testing.T) {
	s := sessionAfter(t, `
type S struct{ X float64 }
type P struct{ L float64 }
table := map[string]float64{"rate": 2}

func decay(s S, q P) S {
	return S{q.L - table["rate"]*s.X}
}
m := continuation.NewModel(decay, P{4})
`)
	if text := shown(t, s, 2, "m"); !strings.Contains(text, "not exact, because cell 1, line 7: maps cannot be recorded") {
		t.Errorf("the model's card says\n%s", text)
	}
	if text := shown(t, s, 3, `m.Settle(S{1}).At("X")`); text != "2" {
		t.Errorf("X = %s, want 2", text)
	}
	closure := shown(t, s, 4, "f := func(s S, q P) S { return S{q.L - s.X} }\ncontinuation.NewModel(f, P{4})")
	if !strings.Contains(closure, "not exact, because the model is a function value") {
		t.Errorf("the model's card says\n%s", closure)
	}
}

func TestResultsKnowWhenTheyAreOutOfDate(t *testing.T) {
	s := sessionAfter(t, "func doubled(x float64) float64 { return 2 * x }", `
type S struct{ X float64 }
type P struct{ L float64 }
func decay(s S, q P) S { return S{q.L - doubled(s.X)} }
`, "m := continuation.NewModel(decay, P{4})\nstart := m.Settle(S{1})")
	const late = "out of date"
	if text := shown(t, s, 4, "start"); strings.Contains(strings.ToLower(text), late) {
		t.Errorf("a fresh result says\n%s", text)
	}
	shown(t, s, 5, "func doubled(x float64) float64 { return 2 * x }") // the same again
	if text := shown(t, s, 6, "start"); strings.Contains(strings.ToLower(text), late) {
		t.Errorf("after a rerun without a change a result says\n%s", text)
	}
	shown(t, s, 7, "func doubled(x float64) float64 { return 3 * x }")
	text := shown(t, s, 8, "start")
	if want := "computed with an earlier definition of doubled (cell 7); rerun cell 3"; !strings.Contains(text, want) {
		t.Errorf("a result of the old model says\n%s\nwant %q", text, want)
	}
	shown(t, s, 9, "m = continuation.NewModel(decay, P{4})\nstart = m.Settle(S{1})")
	if text := shown(t, s, 10, "start"); strings.Contains(strings.ToLower(text), late) {
		t.Errorf("a renewed result says\n%s", text)
	}
}
