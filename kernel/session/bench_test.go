package session

import (
	"fmt"
	"reflect"
	"strings"
	"testing"
)

// fortyLines is a cell of forty lines as an analyst writes them.
var fortyLines = tankCells + `
plant := continuation.NewModel(tank, Params{Inflow: 100, Coolant: 280})
start := plant.Settle(State{0.05, 320})
hot := 0.0
for _, c := range []float64{280, 290, 300} {
	if start.Stable() && c > hot {
		hot = c
	}
	fmt.Printf("%6.2f %6.2f\n", c, start.State[0])
}
path := start.Follow("Coolant", continuation.Within(270, 320))
rows := make([]string, 0, 8)
for i, f := range path.Folds() {
	rows = append(rows, fmt.Sprintf("%d %s", i, f.Kind()))
}
sort.Strings(rows)
text := strings.Join(rows, "; ")
margin := start.MarginTo(path.LimitAbove(start))
len(text)
`

func BenchmarkCheckAndLower(b *testing.B) {
	s, err := New(Options{})
	if err != nil {
		b.Fatal(err)
	}
	defer s.Close()
	b.ReportMetric(float64(strings.Count(strings.TrimSpace(fortyLines), "\n")+1), "lines")
	for _, part := range []string{"check", "check+lower"} {
		b.Run(part, func(b *testing.B) {
			for b.Loop() {
				sp, perr := splitCell(newSource("", 1, fortyLines))
				if perr != nil {
					b.Fatal(perr)
				}
				u := newUnit(s, sp)
				if err := u.check(); err != nil {
					b.Fatal(err)
				}
				if part == "check" {
					continue
				}
				if _, err := u.lower(); err != nil {
					b.Fatal(err)
				}
				u.takeBack()
			}
		})
	}
}

func BenchmarkCell(b *testing.B) {
	for _, src := range []string{"1+1", "x := 3\nfmt.Sprint(x * 2)"} {
		b.Run(fmt.Sprintf("%q", src), func(b *testing.B) {
			s, err := New(Options{})
			if err != nil {
				b.Fatal(err)
			}
			defer s.Close()
			for b.Loop() {
				if res := s.Run(b.Context(), Cell{Number: 1, Source: src}, &recorder{}); res.Err != nil {
					b.Fatal(res.Err)
				}
			}
		})
	}
}

func BenchmarkStart(b *testing.B) {
	for b.Loop() {
		s, err := New(Options{})
		if err != nil {
			b.Fatal(err)
		}
		s.Close()
	}
}

// BenchmarkModelCall calls a model function of two states from compiled code, as the toolkit does without a tape.
func BenchmarkModelCall(b *testing.B) {
	s := sessionAfter(b, tankCells, "f := tank")
	var fn reflect.Value
	for name, p := range s.bound {
		if strings.HasPrefix(name, "f"+mark) {
			fn = p.Elem()
		}
	}
	if fn.Kind() != reflect.Func {
		b.Fatalf("no function: %v", fn)
	}
	state, params := reflect.Zero(fn.Type().In(0)), reflect.Zero(fn.Type().In(1))
	for b.Loop() {
		fn.Call([]reflect.Value{state, params})
	}
}

func BenchmarkInterpretedLoop(b *testing.B) {
	s, err := New(Options{})
	if err != nil {
		b.Fatal(err)
	}
	defer s.Close()
	for b.Loop() {
		if res := s.Run(b.Context(), Cell{Number: 1, Source: "s := 0.0\nfor i := 0; i < 100000; i++ { s += float64(i) }"}, &recorder{}); res.Err != nil {
			b.Fatal(res.Err)
		}
	}
}
