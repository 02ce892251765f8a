package tape

import (
	"errors"
	"slices"
	"sync"
)

// maxPrograms bounds how many patterns of guards a model may have.
const maxPrograms = 64

// ErrGuards says that a model has more patterns of guards than are kept.
var ErrGuards = errors.New("the conditions of the model go too many different ways")

// A Family is a model with the programs recorded of it so far, one for each
// pattern of guards that was met. It may be used by several goroutines.
type Family struct {
	src      *Source
	settings Settings

	mu       sync.Mutex
	programs []*Program // the last one used first
	probes   map[*Program]*Machine
	recorded int
}

// NewFamily returns a family without programs.
func NewFamily(src *Source, set Settings) *Family { return &Family{src: src, settings: set} }

// At returns a program whose guards hold at x and p, and whose view of what lies
// outside of the model is up to date; it records one where there is none.
func (f *Family) At(x, p []float64) (*Program, error) {
	f.mu.Lock()
	defer f.mu.Unlock()
	f.programs = slices.DeleteFunc(f.programs, func(q *Program) bool {
		if q.Current() {
			return false
		}
		delete(f.probes, q)
		return true
	})
	for i, q := range f.programs {
		if f.holds(q, x, p) {
			f.programs = slices.Insert(slices.Delete(f.programs, i, i+1), 0, q)
			return q, nil
		}
	}
	if len(f.programs) >= maxPrograms {
		return nil, ErrGuards
	}
	set := f.settings
	set.X, set.P = slices.Clone(x), slices.Clone(p)
	q, err := Record(f.src, set)
	if err != nil {
		return nil, err
	}
	f.recorded++
	f.programs = slices.Insert(f.programs, 0, q)
	return q, nil
}

// holds reports whether the guards of a program hold.
func (f *Family) holds(q *Program, x, p []float64) bool {
	if len(q.guards) == 0 {
		return true
	}
	m := f.probes[q]
	if m == nil {
		m = q.Value().NewMachine()
		if f.probes == nil {
			f.probes = map[*Program]*Machine{}
		}
		f.probes[q] = m
	}
	return m.Run(x, p)
}

// First returns the program used last, or records one at a point of the caller's
// where there is none yet.
func (f *Family) First(x, p []float64) (*Program, error) {
	f.mu.Lock()
	if len(f.programs) > 0 && f.programs[0].Current() {
		defer f.mu.Unlock()
		return f.programs[0], nil
	}
	f.mu.Unlock()
	return f.At(x, p)
}

// Recorded returns how many recordings were made.
func (f *Family) Recorded() int {
	f.mu.Lock()
	defer f.mu.Unlock()
	return f.recorded
}
