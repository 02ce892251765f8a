package session

import (
	"fmt"
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
			x := p.Elem().Interface()
			s.note(x)
			s.recordNames(v.name, x)
			s.recordShort(v.name, x)
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

// recordShort keeps the short form of a value for inspection: plain values in full, of others nothing that would take time.
func (s *Session) recordShort(name string, x any) {
	short := ""
	switch v := reflect.ValueOf(x); v.Kind() {
	case reflect.Bool, reflect.Int, reflect.Int8, reflect.Int16, reflect.Int32, reflect.Int64, reflect.Uint, reflect.Uint8,
		reflect.Uint16, reflect.Uint32, reflect.Uint64, reflect.Float32, reflect.Float64, reflect.Complex64, reflect.Complex128:
		short = fmt.Sprintf("= %v", x)
	case reflect.String:
		text := v.String()
		if len(text) > 60 {
			text = text[:60] + "..."
		}
		short = fmt.Sprintf("= %q", text)
	case reflect.Slice, reflect.Map:
		short = fmt.Sprintf("%d elements", v.Len())
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	s.shorts[name] = short
}
