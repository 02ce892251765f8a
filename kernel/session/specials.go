package session

import (
	"reflect"

	"brinkline/continuation"
)

// Specials returns one line a special point found in values shown or bound so far, in order and without repetitions.
func (s *Session) Specials() []string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return append([]string(nil), s.known...)
}

// noteVariables looks for special points in the variables that a cell bound.
func (s *Session) noteVariables(low *lowered) {
	for _, v := range low.vars {
		if p, ok := s.bound[v.internal()]; ok && p.Kind() == reflect.Pointer && !p.IsNil() && p.Elem().CanInterface() {
			s.note(p.Elem().Interface())
		}
	}
}

// note remembers the special points of a value.
func (s *Session) note(v any) {
	switch v := v.(type) {
	case *continuation.Branch:
		if v != nil {
			for _, sp := range v.Specials() {
				s.remember(sp)
			}
		}
	case continuation.Special:
		if rv := reflect.ValueOf(v); rv.Kind() != reflect.Pointer || !rv.IsNil() {
			s.remember(v)
		}
	case interface{ Branch() *continuation.Branch }:
		if rv := reflect.ValueOf(v); rv.Kind() != reflect.Pointer || !rv.IsNil() {
			s.note(v.Branch())
		}
	}
}

func (s *Session) remember(sp continuation.Special) {
	line := sp.Summary()
	s.mu.Lock()
	defer s.mu.Unlock()
	if !s.knownSet[line] {
		s.knownSet[line] = true
		s.known = append(s.known, line)
	}
}
