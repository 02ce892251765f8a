package tape_test

import (
	"context"
	"errors"
	"go/ast"
	"go/types"
	"math"
	"reflect"
	"strings"
	"testing"

	"brinkline/continuation/tape"
)

// Each model ends in a comment on the line that is to be blamed, with the
// reason.
var refusals = []string{
	`func model(u []float64, q Params, f []float64) {
	x := u[0]
	for math.Abs(x) > 1e-3 { // the loop runs until a float condition holds
		x /= 2
	}
	f[0] = x
}`,
	`func model(u []float64, q Params, f []float64) {
	x := u[0]
	for {
		x /= 2
		if x < 1 { // the loop runs until a float condition holds
			break
		}
	}
	f[0] = x
}`,
	`func model(u []float64, q Params, f []float64) {
	f[0] = half(u[0])
}
func half(x float64) float64 {
	for {
		x /= 2
		if x < 1 { // the loop runs until a float condition holds
			return x
		}
	}
}`,
	`func model(u []float64, q Params, f []float64) {
	f[0] = float64(int(u[0])) // a float becomes an integer
}`,
	`func model(u []float64, q Params, f []float64) {
	rates := map[string]float64{"a": 1} // maps cannot be recorded
	f[0] = rates["a"] * u[0]
}`,
	`func model(u []float64, q Params, f []float64) {
	c := make(chan float64, 1) // only slices can be made in a recording; maps and channels cannot
	c <- u[0]
	f[0] = <-c
}`,
	`func model(u []float64, q Params, f []float64) {
	go work() // a go statement cannot be recorded
}
func work() {}`,
	`func model(u []float64, q Params, f []float64) {
	defer work() // a defer statement cannot be recorded
}
func work() {}`,
	`import ("fmt"; "math")
func model(u []float64, q Params, f []float64) {
	fmt.Println(u[0]) // undefined: fmt.Println
	f[0] = math.Exp(u[0])
}`,
	`func model(u []float64, q Params, f []float64) {
	calls++ // the variable calls is not part of the model; pass it as a parameter or make it a constant
	f[0] = u[0]
}
var calls int`,
	`func model(u []float64, q Params, f []float64) {
	f[0] = u[3] // index 3 out of range with length 1
}`,
	`func model(u []float64, q Params, f []float64) {
	f[0] = float64(float32(u[0])) // the conversion to float32 cannot be recorded
}`,
	`func model(u []float64, q Params, f []float64) {
	f[0] = real(complex(u[0], 1)) // real cannot be recorded
}`,
	`func model(u []float64, q Params, f []float64) {
	f[0] = twice(u[0]) // generic functions cannot be recorded
}
func twice[T any](x T) T { return x }`,
	`func model(u []float64, q Params, f []float64) {
	f[0] = math.Float64frombits(math.Float64bits(u[0])) // math.Float64bits cannot be recorded: it has no derivative
}`,
	`func model(u []float64, q Params, f []float64) {
	panic("not yet") // the model panics here
}`,
	`func model(u []float64, q Params, f []float64) {
	f[0] = deep(u[0])
}
func deep(x float64) float64 {
	return deep(x + 1) // calls are nested more than 2000 deep
}`,
	`func model(u []float64, q Params, f []float64) {
	for i := 0; i < 10000000; i++ {
		f[0] = f[0]*u[0] + 1 // the model takes more than 2000000 operations
	}
}`,
	`func model(u []float64, q Params, f []float64) {
	n := 0
	for i := 0; i >= 0; i++ { // the model takes too long to record
		n += i
	}
	f[0] = u[0]
}`,
	`func model(u []float64, q Params, f []float64) { // the model must be func(State, Params) State or func(u []float64, q Params, f []float64)
	return
}`,
	`func model(u []float64, q Params, f []float64) {
	n := 1 - q.N
	f[0] = u[0] * float64(3/n) // an integer is divided by zero
}`,
	`func model(u []float64, q Params, f []float64) {
	x := u[0]
	f[0] = x + change(&x) // the right side changes what the left side reads; the language leaves their order open
}
func change(p *float64) float64 { *p = 10; return 1 }`,
	`func model(u []float64, q Params, f []float64) {
	var p *float64
	f[0] = u[0] * *p // a nil pointer is followed
}`,
}

type refusalParams struct {
	A float64
	N int
}

func TestRefusalsNameTheirLine(t *testing.T) {
	for _, text := range refusals {
		line, reason := 0, ""
		for i, l := range strings.Split(text, "\n") {
			if _, comment, ok := strings.Cut(l, " // "); ok {
				line, reason = i+1, comment
			}
		}
		if strings.HasPrefix(reason, "the model must be") {
			text = strings.Replace(text, "q Params, ", "", 1)
		}
		_, err := recordText(text+"\ntype Params struct { A float64; N int }\n", nil)
		var refusal *tape.Refusal
		if !errors.As(err, &refusal) {
			t.Errorf("%s\nerror %v, want %q", text, err, reason)
			continue
		}
		if want := "line " + string('0'+rune(line)) + ": " + reason; err.Error() != want {
			t.Errorf("%s\nerror %q, want %q", text, err, want)
		}
	}
}

func recordText(text string, variable func(*types.Var) (reflect.Value, error)) (*tape.Program, error) {
	src, err := tape.Parse("model", text)
	if err != nil {
		return nil, err
	}
	src.Variable = variable
	return tape.Record(src, tape.Settings{States: 1, Params: reflect.ValueOf(refusalParams{A: 2, N: 1})})
}

func TestParseErrors(t *testing.T) {
	for text, want := range map[string]string{
		"func model(":    "the source does not parse: ",
		"func tank() {}": "the source declares no function model",
	} {
		if _, err := tape.Parse("model", text); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: error %v, want %q", text, err, want)
		}
	}
}

func TestRecordingEndsWithItsContext(t *testing.T) {
	src, err := tape.Parse("model", `func model(u []float64, q struct{ A float64 }, f []float64) {
	n := 0
	for i := range 1 << 30 { n += i }
}`)
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	_, err = tape.Record(src, tape.Settings{States: 1, Context: func() context.Context { return ctx }})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

type kineticsTable struct {
	Scale float64
	Order int
	Rates []float64
	Next  *kineticsTable
}

const sessionModel = `
type Table struct {
	Scale float64
	Order int
	Rates []float64
	Next *Table
}
type Params struct { A float64; N int }

var table Table
var shift float64
var count int

func model(u []float64, q Params, f []float64) {
	v := shift
	for i := range count {
		v += table.Rates[i] * u[0]
	}
	for range table.Order {
		v *= table.Scale
	}
	f[0] = v + q.A*table.Next.Scale
}
`

// Variables of the session: floats are read at each run, what is counted or
// listed is watched.
func TestOutsideVariables(t *testing.T) {
	next := kineticsTable{Scale: 100}
	table := kineticsTable{Scale: 3, Order: 2, Rates: []float64{1, 2, 3}, Next: &next}
	shift, count := 0.5, 2
	values := map[string]reflect.Value{
		"table": reflect.ValueOf(&table).Elem(), "shift": reflect.ValueOf(&shift).Elem(), "count": reflect.ValueOf(&count).Elem(),
	}
	src, err := tape.Parse("model", sessionModel)
	if err != nil {
		t.Fatal(err)
	}
	src.Variable = func(v *types.Var) (reflect.Value, error) { return values[v.Name()], nil }
	family := tape.NewFamily(src, tape.Settings{States: 1, Params: reflect.ValueOf(refusalParams{A: 2})})
	x, p := []float64{5}, []float64{2}
	check := func(recordings int) {
		t.Helper()
		want := shift
		for i := range count {
			want += table.Rates[i] * x[0]
		}
		for range table.Order {
			want *= table.Scale
		}
		want += p[0] * table.Next.Scale
		program, err := family.At(x, p)
		if err != nil {
			t.Fatal(err)
		}
		m := program.Value().NewMachine()
		m.Run(x, p)
		if m.Out()[0] != want {
			t.Errorf("f is %v, want %v", m.Out()[0], want)
		}
		if family.Recorded() != recordings {
			t.Errorf("%d recordings, want %d", family.Recorded(), recordings)
		}
	}
	check(1)
	shift, table.Scale, next.Scale = 0.75, 4, 10
	check(1)
	count = 3
	check(2)
	table.Rates[1] = 20
	check(3)
	table.Order = 1
	check(4)
	table.Rates = []float64{9, 8, 7, 6}
	check(5)
	table.Next = &kineticsTable{Scale: -1}
	check(6)
	program, _ := family.At(x, p)
	if got := strings.Join(program.Hidden(), " "); got != "shift table.Scale table.Next.Scale" {
		t.Errorf("hidden parameters: %s", got)
	}
	if got := strings.Join(program.Snapshots(), " "); got != "count table.Order table.Rates table.Next table.Next.Order table.Next.Rates table.Next.Next" {
		t.Errorf("snapshots: %s", got)
	}
	if program.Value().NewMachine().Run(x, p); shift != 0.75 || count != 3 || table.Order != 1 {
		t.Error("a recording changed a variable")
	}
}

func TestOutsideVariablesAreNotWritten(t *testing.T) {
	list, n := []float64{1, 2}, 7
	variable := func(v *types.Var) (reflect.Value, error) {
		return map[string]reflect.Value{"list": reflect.ValueOf(&list).Elem(), "n": reflect.ValueOf(&n).Elem()}[v.Name()], nil
	}
	for _, statement := range []string{"n++", "list[0] = u[0]", "list = nil", "p := &list[1]; *p = 3", "n, f[0] = 2, 1", "copy(list, u)", "list = append(list, 1)"} {
		_, err := recordText("type Params struct { A float64; N int }\nvar list []float64\nvar n int\nfunc model(u []float64, q Params, f []float64) {\n"+statement+"\n}", variable)
		if err == nil || err.Error() != "line 5: the model writes to a variable outside of it" {
			t.Errorf("%s: error %v", statement, err)
		}
	}
	if list[0] != 1 || list[1] != 2 || n != 7 {
		t.Error("a recording changed a variable")
	}
}

// A function literal is recorded with what it captures.
func TestLiteral(t *testing.T) {
	k := 4.0
	src, err := tape.Parse("around", `func around() func(u []float64, q struct{ A float64 }, f []float64) {
	k := 4.0
	return func(u []float64, q struct{ A float64 }, f []float64) { f[0] = k*u[0] - q.A }
}`)
	if err != nil {
		t.Fatal(err)
	}
	ast.Inspect(src.Files[0], func(n ast.Node) bool {
		if lit, ok := n.(*ast.FuncLit); ok {
			src.Lit = lit
		}
		return true
	})
	src.Variable = func(v *types.Var) (reflect.Value, error) { return reflect.ValueOf(&k).Elem(), nil }
	p, err := tape.Record(src, tape.Settings{States: 1, Params: reflect.ValueOf(struct{ A float64 }{1})})
	if err != nil {
		t.Fatal(err)
	}
	m := p.Value().NewMachine()
	k = 6
	if m.Run([]float64{2}, []float64{5}); m.Out()[0] != 7 {
		t.Errorf("f is %v, want 7", m.Out()[0])
	}
}

func TestBlameNamesTheLine(t *testing.T) {
	text := `type Params struct { A float64; N int }
func model(u []float64, q Params, f []float64) {
	y := 1.0
	if u[0] > 0 {
		y = math.Log(u[0])
	}
	z := math.Sqrt(u[0] + 3)
	f[0] = y + z/(q.A-1)
}`
	p, err := recordText(text, nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, test := range []struct {
		x, a float64
		want string
	}{{1, 2, ""}, {-1, 2, ""}, {-4, 2, "line 7: math.Sqrt is NaN"}, {1, 1, "line 8: division by zero is infinite"}, {math.Inf(1), 2, ""}} {
		if got := p.Blame([]float64{test.x}, []float64{test.a}); got != test.want {
			t.Errorf("at %v, %v: %q, want %q", test.x, test.a, got, test.want)
		}
	}
}

func TestMendedQuotientsAreNoted(t *testing.T) {
	for condition, want := range map[string]string{
		"math.Abs(x) < 1e-6":    "line 4: one side is for sizes below 1e-06 only; derivatives there are those of that side",
		"x*x <= 1e-9":           "line 4: one side is for sizes below 1e-09 only; derivatives there are those of that side",
		"!(1e-6 < math.Abs(x))": "line 4: one side is for sizes below 1e-06 only; derivatives there are those of that side",
		"x == 0":                "line 4: one side is for the single value 0; derivatives there are those of that side",
		"x < 1e-6":              "",
		"math.Abs(x) < 2":       "",
	} {
		p, err := recordText("type Params struct { A float64; N int }\nfunc model(u []float64, q Params, f []float64) {\n\tx := u[0]\n\tif "+condition+" {\n\t\tf[0] = 1 - x/2\n\t} else {\n\t\tf[0] = x / math.Expm1(x)\n\t}\n}", nil)
		if err != nil {
			t.Fatal(err)
		}
		if got := strings.Join(p.Notes(), "|"); got != want {
			t.Errorf("%s: notes %q, want %q", condition, got, want)
		}
	}
}
