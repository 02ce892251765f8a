package main

import (
	"errors"
	"fmt"
	"testing"

	"brinkline/kernel/notebook"
	"brinkline/kernel/session"
)

func TestExitCodes(t *testing.T) {
	stopped := func(interrupted bool) error {
		return fmt.Errorf("run: %w", &notebook.CellError{Number: 1, Err: &session.Error{Message: "x", Interrupted: interrupted}})
	}
	for _, c := range []struct {
		err  error
		want int
	}{
		{nil, 0},
		{errors.New("x"), 1},
		{stopped(false), 1},
		{stopped(true), 130},
		{errors.Join(stopped(true), errors.New("and the report can't be written")), 130},
	} {
		if got := exitCode(c.err); got != c.want {
			t.Errorf("%v exits with %d, want %d", c.err, got, c.want)
		}
	}
}
