package session

import (
	"slices"
	"strings"
	"testing"
)

// sessionAfter runs cells and fails the test when one does not succeed.
func sessionAfter(t testing.TB, cells ...string) *Session {
	t.Helper()
	s, err := New(Options{})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(s.Close)
	for i, c := range cells {
		res := s.Run(t.Context(), Cell{Number: i + 1, Source: c}, &recorder{})
		if res.Err != nil {
			t.Fatalf("cell %d: %v\n%s", i+1, res.Err, strings.Join(res.Err.Traceback, "\n"))
		}
	}
	return s
}

const tankCells = `
type State struct {
	Conversion  float64
	Temperature float64 ` + "`unit:\"K\" scale:\"300\"`" + `
}
type Params struct {
	Inflow  float64 ` + "`unit:\"L/min\"`" + `
	Coolant float64 ` + "`unit:\"K\"`" + `
}
// tank is the balance of a cooled stirred tank.
func tank(s State, q Params) State {
	k := 7.2e10 * math.Exp(-8750/s.Temperature)
	r := k * (1 - s.Conversion)
	return State{
		Conversion:  -q.Inflow/100*s.Conversion + r,
		Temperature: q.Inflow/100*(350-s.Temperature) + 209.2*r - 2.0921*(s.Temperature-q.Coolant),
	}
}
`

func TestComplete(t *testing.T) {
	s := sessionAfter(t, tankCells, `
plant := continuation.NewModel(tank, Params{Inflow: 100, Coolant: 290})
start := plant.Settle(State{0.1, 320})
`)
	for _, c := range []struct {
		source      string // the cursor is at |
		want, never string // names that must and must not be offered
	}{
		{"fmt.Printl|", "Println", "Printf"},
		{"start.Fol|", "Follow", "At"},
		{"start.Follow(|", "start", ""},
		{"x := plant.Settle(State{0.1, 300})\nx.Ste|", "StepLength", "Follow"},
		{"plant.Settle(State{0.1, 300}).Fol|", "Follow", ""},
		{"State{Tem|}", "Temperature", "Conversion"},
		{"q := Params{Inflow: 1, |", "Coolant", "Inflow"},
		{"func g(alpha float64) float64 {\n\treturn al|\n}", "alpha", ""},
		{"ta|", "tank", "plant"},
		{"start.Follow(\"Coo|\")", "Coolant", "Temperature"},
		{"start.Follow(\"|", "Inflow", "Temperature"},
		{"start.At(\"T|\")", "Temperature", "Coolant"},
		{"displ|", "display", ""},
		{"if start.St|", "Stable", ""},
	} {
		at := strings.IndexByte(c.source, '|')
		text := strings.Replace(c.source, "|", "", 1)
		got := s.Complete(text, len([]rune(c.source[:at])))
		if !slices.Contains(got.Matches, c.want) || c.never != "" && slices.Contains(got.Matches, c.never) {
			t.Errorf("%q offers %v, want %s and not %s", c.source, got.Matches, c.want, c.never)
		}
	}
}

func TestCompletePositionsAreCharacters(t *testing.T) {
	s := sessionAfter(t)
	got := s.Complete("µ := \"äö\"; fmt.Printl", 21)
	if got.Start != 15 || got.End != 21 || !slices.Contains(got.Matches, "Println") {
		t.Errorf("got %+v", got)
	}
}

func TestIsComplete(t *testing.T) {
	s := sessionAfter(t)
	for _, c := range []struct{ source, status, indent string }{
		{"x := 1", "complete", ""},
		{"for i := range 3 {", "incomplete", "\t"},
		{"fmt.Println(", "incomplete", "\t"},
		{"x := []int{\n1,", "incomplete", "\t"},
		{"x :=", "incomplete", ""},
		{"s := `abc", "incomplete", ""},
		{"/* open", "incomplete", ""},
		{"x := )", "invalid", ""},
		{"func (", "incomplete", "\t"},
		{"x := 1 2", "invalid", ""},
		{"", "complete", ""},
	} {
		if st, in := s.IsComplete(c.source); st != c.status || in != c.indent {
			t.Errorf("%q is %s with indent %q, want %s with %q", c.source, st, in, c.status, c.indent)
		}
	}
}

func TestInspect(t *testing.T) {
	s := sessionAfter(t, tankCells, "rate := 2.5\nplant := continuation.NewModel(tank, Params{100, 290})\nstart := plant.Settle(State{0.1, 320})")
	for _, c := range []struct{ source, want string }{
		{"tank|", "tank is the balance of a cooled stirred tank."},
		{"tank|", "func tank(s State, q Params) State"},
		{"rate|", "= 2.5"},
		{"fmt.Println|(1)", "Println formats using the default formats"},
		{"start.Follow|(\"Coolant\")", "Follow"},
		{"start.Follow(|", "func (*continuation.Point).Follow"},
		{"math|.Pi", "package math"},
		{"plant.Settle(State{0.1, 320}).Unstable|", "int"},
	} {
		at := strings.IndexByte(c.source, '|')
		b, ok := s.Inspect(strings.Replace(c.source, "|", "", 1), at)
		if !ok || !strings.Contains(b.Text(), c.want) {
			t.Errorf("%q says %q, want %q", c.source, b.Text(), c.want)
		}
	}
}
