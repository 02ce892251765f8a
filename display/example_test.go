package display_test

import (
	"bytes"
	"fmt"
	"log"
	"strings"

	"brinkline/continuation"
	"brinkline/display"
)

// A switch with hysteresis: x' = Push + x - x³.
type switchState struct {
	Angle float64 `unit:"rad"`
}

type switchParams struct {
	Push float64 `unit:"N"`
}

func toggle(s switchState, q switchParams) switchState {
	return switchState{q.Push + s.Angle - s.Angle*s.Angle*s.Angle}
}

func followSwitch() *continuation.Branch {
	model, err := continuation.NewModel(toggle, switchParams{Push: -1}, continuation.Named("switch"))
	if err != nil {
		log.Fatal(err)
	}
	start, err := model.Settle(switchState{-1.3})
	if err != nil {
		log.Fatal(err)
	}
	path, err := start.Follow("Push", continuation.Within(-1, 1))
	if err != nil {
		log.Fatal(err)
	}
	return path
}

func ExampleTable() {
	path := followSwitch()
	fmt.Println(display.Table(path.Folds()).Caption("Where the switch flips"))
	// Output:
	// Where the switch flips
	// what       Push (N)  Angle (rad)  before        after         digits
	// ----  -------------  -----------  ------------  ------------  ------
	// fold   0.3849001795    -0.577350  stable        unstable (1)      14
	// fold  -0.3849001795     0.577350  unstable (1)  stable            14
	// In parentheses: eigenvalues with positive real part.
}

func ExamplePlot() {
	path := followSwitch()
	var file bytes.Buffer
	figure := display.Plot(path).Y("Angle").Size(12, 8)
	if err := figure.WriteSVG(&file); err != nil {
		log.Fatal(err)
	}
	fmt.Println(strings.Contains(file.String(), ">fold 0.3849 N</text>"))
	fmt.Println(display.Plot(path).Y("Angl").Err())
	// Output:
	// true
	// no state, parameter or quantity "Angl"; the model has Angle, Push (did you mean Angle?)
}

func ExampleShow() {
	path := followSwitch()
	start := path.Points()[0]
	margin, err := start.MarginTo(path.Folds()[0])
	if err != nil {
		log.Fatal(err)
	}
	if err := display.Show(margin); err != nil {
		log.Fatal(err)
	}
	// Output:
	// Margin of switch in Push
	//                                       value
	//   ---------------------------  ------------
	//   now                                  -1 N
	//   limit (fold)                 0.38490018 N
	//   margin                           1.3849 N
	//   in percent of the value now       138.5 %
	//   direction                    up: the other parameters stay as they are
	// This limit is a property of the model, not a safety limit; local codes and licensed practice decide.
}
