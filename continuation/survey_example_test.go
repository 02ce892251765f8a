package continuation_test

import (
	"fmt"

	"brinkline/continuation"
)

func ExampleModel_Survey() {
	type state struct{ X float64 }
	type params struct{ Push float64 }
	m, err := continuation.NewModel(func(s state, q params) state {
		return state{q.Push + s.X - s.X*s.X*s.X}
	}, params{0})
	if err != nil {
		panic(err)
	}
	found, err := m.Survey(continuation.Box{"X": {-2, 2}})
	if err != nil {
		panic(err)
	}
	for _, p := range found.Points() {
		fmt.Printf("X %.3f, stable %t\n", p.State[0], p.Stable())
	}
	// Output:
	// X -1.000, stable true
	// X 0.000, stable false
	// X 1.000, stable true
}

func ExampleModel_FollowAll() {
	type state struct{ X float64 }
	type params struct{ Push float64 }
	m, err := continuation.NewModel(func(s state, q params) state {
		return state{(s.X + 1) * (s.X*s.X + q.Push*q.Push - 0.25)}
	}, params{0})
	if err != nil {
		panic(err)
	}
	all, err := m.FollowAll("Push", continuation.Box{"Push": {-1, 1}, "X": {-2, 2}})
	if err != nil {
		panic(err)
	}
	for _, b := range all.Branches() {
		fmt.Println("closed:", b.Closed(), "folds:", len(b.Folds()))
	}
	// Output:
	// closed: false folds: 0
	// closed: true folds: 2
}

func ExampleModel_Relax() {
	type state struct{ X, Y float64 }
	type params struct{ Mu float64 }
	m, err := continuation.NewModel(func(s state, q params) state {
		return state{s.Y, q.Mu*(1-s.X*s.X)*s.Y - s.X}
	}, params{1})
	if err != nil {
		panic(err)
	}
	rest, err := m.Relax(state{0.1, 0})
	if err != nil {
		panic(err)
	}
	fmt.Printf("period %.3f\n", rest.Oscillation().Period)
	// Output:
	// period 6.663
}
