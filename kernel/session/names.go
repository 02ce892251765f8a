package session

import (
	"reflect"
	"slices"

	"brinkline/continuation"
)

// modelled are the names that a value's model has. They are recorded after each cell, so that completion need not touch the value.
type modelled struct {
	states, parameters []string
}

// recordNames notes the names of the model behind a variable.
func (s *Session) recordNames(variable string, v any) {
	m := modelOf(v)
	if m == nil {
		return
	}
	var n modelled
	for _, x := range m.States() {
		n.states = append(n.states, x.Name)
	}
	for _, x := range m.Parameters() {
		n.parameters = append(n.parameters, x.Name)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	s.modelled[variable] = n
}

// modelOf finds the model that a value of the toolkit belongs to.
func modelOf(v any) *continuation.Model {
	if rv := reflect.ValueOf(v); rv.Kind() == reflect.Pointer && rv.IsNil() {
		return nil
	}
	switch v := v.(type) {
	case *continuation.Model:
		return v
	case interface{ Model() *continuation.Model }:
		return v.Model()
	case interface{ Branch() *continuation.Branch }:
		if b := v.Branch(); b != nil {
			return b.Model()
		}
	}
	return nil
}

// modelNames lists what a string argument of a method of the toolkit can name: of the receiver's model when it is known, else of all.
func (s *Session) modelNames(recv, method string) []string {
	s.mu.Lock()
	defer s.mu.Unlock()
	pick := func(n modelled) []string {
		switch method {
		case "Follow", "Walk", "Bound":
			return n.parameters
		case "Steer", "Local":
			return n.states
		}
		return append(slices.Clone(n.parameters), n.states...)
	}
	if n, ok := s.modelled[recv]; ok {
		return pick(n)
	}
	var all []string
	for _, n := range s.modelled {
		all = append(all, pick(n)...)
	}
	slices.Sort(all)
	return slices.Compact(all)
}
