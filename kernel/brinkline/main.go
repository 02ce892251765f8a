// Command brinkline runs notebooks of steady-state models and is their kernel.
package main

import (
	"context"
	"errors"
	"fmt"
	"os"

	"brinkline/kernel/notebook"
)

// Exit codes: 1 for anything that went wrong, and what shells give a program
// that was interrupted.
const (
	exitError       = 1
	exitInterrupted = 130
)

func main() {
	err := root().ExecuteContext(context.Background())
	if err != nil {
		fmt.Fprintln(os.Stderr, "brinkline: "+err.Error())
	}
	os.Exit(exitCode(err))
}

func exitCode(err error) int {
	var cell *notebook.CellError
	switch {
	case err == nil:
		return 0
	case errors.As(err, &cell) && cell.Err.Interrupted:
		return exitInterrupted
	default:
		return exitError
	}
}
