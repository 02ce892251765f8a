package display_test

import (
	"fmt"
	"log"

	"brinkline/continuation"
	"brinkline/display"
)

// A switch whose hysteresis vanishes as its spring is weakened: x' = Push + Spring x
// - x³ for x = Angle - 0.5. Its folds lie at Push = ±2 (Spring/3)^(3/2) and meet in a
// cusp at 0, 0.
type springParams struct {
	Push   float64 `unit:"N"`
	Spring float64 `unit:"N/rad"`
}

func spring(s switchState, q springParams) switchState {
	x := s.Angle - 0.5
	return switchState{q.Push + q.Spring*x - x*x*x}
}

func followSpring() (*continuation.Branch, *continuation.Locus) {
	model, err := continuation.NewModel(spring, springParams{Push: -1, Spring: 1}, continuation.Named("switch"))
	if err != nil {
		log.Fatal(err)
	}
	start, err := model.Settle(switchState{-0.8})
	if err != nil {
		log.Fatal(err)
	}
	path, err := start.Follow("Push", continuation.Within(-1, 1))
	if err != nil {
		log.Fatal(err)
	}
	edge, err := path.Folds()[0].Follow("Spring", continuation.Within(-1, 2))
	if err != nil {
		log.Fatal(err)
	}
	return path, edge
}

func ExamplePlot_locus() {
	path, edge := followSpring()
	figure := display.Plot(path, edge).X("Push").Y("Spring")
	if err := figure.Err(); err != nil {
		log.Fatal(err)
	}
	fmt.Println(display.Table(edge.Cusps()))
	// Output:
	// Special points of loci
	// what  Push (N)  Spring (N/rad)  Angle (rad)  coefficients
	// ----  --------  --------------  -----------  ------------
	// cusp         0               0     0.500000  c = -1
	// c = 1/6 wᵀ (f_xxx[v, v, v] + 3 f_xx[v, h]) for |v| = 1 in the units shown, wᵀ v = 1.
}

func ExampleEigenvalues() {
	path, _ := followSpring()
	start := path.Points()[path.Start()]
	fmt.Println(display.Eigenvalues(start))
	fmt.Println(display.Eigenvalues(path).Y("Angle").Err())
	// Output:
	// Eigenvalues of f_x in the complex plane, steady state at Push -1 N, Angle -0.824718 rad: -4.265. Stable: the eigenvalue is negative. The lines are the real and the imaginary axis.
	// the y axis of a figure of eigenvalues is theirs; Y cannot change it
}
