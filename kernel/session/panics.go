package session

import (
	"errors"
	"fmt"
	"reflect"
	"strings"
)

// runtimeError is an error of the Go runtime as a cell sees it.
type runtimeError struct{ text string }

func (e *runtimeError) Error() string {
	return "runtime error: " + strings.TrimPrefix(e.text, "runtime error: ")
}

// RuntimeError marks it as runtime.Error does.
func (e *runtimeError) RuntimeError() {}

var nilDereference = &runtimeError{"invalid memory address or nil pointer dereference"}

// stop is the panic with which a cell ends on an error that it does not take.
type stop struct {
	err error
	pos int
}

func (e *stop) Error() string { return e.err.Error() }
func (e *stop) Unwrap() error { return e.err }

// interrupted is the panic with which an interrupted cell ends.
type interruption struct{}

func (interruption) Error() string { return "interrupted" }

// quietEnd is the panic with which os.Exit(0) ends a cell.
type quietEnd struct{}

var errInterrupted = interruption{}

// userPanic carries the value of a panic of the cell, so that one of nil and plain ones are told from faults of the interpreter.
type userPanic struct{ value any }

func cellPanic(v any) any {
	if v == nil {
		return &userPanic{&runtimeError{"panic called with nil argument (use GODEBUG=panicnil=1 to disable)"}}
	}
	return &userPanic{v}
}

// recovered turns what the interpreter caught into what recover gives in Go.
func recovered(v any) any {
	switch v := unwrapPanic(v).(type) {
	case nil:
		return nil
	case *userPanic:
		return v.value
	case error:
		return goError(v)
	case string:
		return goError(errors.New(v))
	default:
		return v
	}
}

// unwrapPanic removes the layers that reflection and the interpreter put around a panic.
func unwrapPanic(v any) any {
	for {
		switch w := v.(type) {
		case reflect.Value:
			if !w.IsValid() || !w.CanInterface() {
				return nil
			}
			v = w.Interface()
		default:
			return v
		}
	}
}

// goError words errors of reflection, on which the interpreter rests, as the Go runtime does.
func goError(err error) error {
	text := err.Error()
	var re interface{ RuntimeError() }
	if errors.As(err, &re) {
		if strings.Contains(text, "nil pointer") {
			return nilDereference
		}
		return err
	}
	switch {
	case strings.Contains(text, "index out of range"):
		return &runtimeError{"index out of range"}
	case strings.Contains(text, "slice bounds out of range"), strings.Contains(text, "string slice index out of bounds"),
		strings.Contains(text, "slice index out of bounds"):
		return &runtimeError{"slice bounds out of range"}
	case strings.Contains(text, "on zero Value"), strings.Contains(text, "nil pointer"):
		return nilDereference
	case strings.Contains(text, "negative len"), strings.Contains(text, "negative cap"), strings.Contains(text, "len > cap"),
		strings.Contains(text, "len out of range"), strings.Contains(text, "cap out of range"):
		return &runtimeError{"makeslice: len out of range"}
	case strings.Contains(text, "call of nil function"), strings.Contains(text, "function of nil"):
		return nilDereference
	case strings.Contains(text, "hash of unhashable type"):
		return &runtimeError{text}
	}
	return err
}

// panicText words a panic for the analyst.
func panicText(v any) string {
	switch v := v.(type) {
	case *userPanic:
		return panicText(v.value)
	case box:
		if v.t.method("Error") != nil {
			return errorBox{v}.Error()
		}
		return fmt.Sprint(printable(v))
	case error:
		return goError(v).Error()
	case string:
		return v
	}
	return fmt.Sprintf("%v", v)
}
