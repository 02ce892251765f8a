package session

import (
	"slices"
	"sync"
)

// oldTypes are superseded types that values still have, and the methods that they had.
type oldTypes struct {
	mu      sync.RWMutex
	byName  map[string]*def // by internal name
	methods map[*def][]*def
}

func (o *oldTypes) add(d *def, methods []*def) {
	o.mu.Lock()
	defer o.mu.Unlock()
	if o.byName == nil {
		o.byName, o.methods = map[string]*def{}, map[*def][]*def{}
	}
	o.byName[d.hidden()] = d
	if methods != nil {
		o.methods[d] = methods
	}
}

// named finds a superseded type by its internal name.
func (o *oldTypes) named(name string) *def {
	o.mu.RLock()
	defer o.mu.RUnlock()
	return o.byName[name]
}

func (o *oldTypes) methodsOf(d *def) []*def {
	o.mu.RLock()
	defer o.mu.RUnlock()
	return o.methods[d]
}

// ownerOf finds the superseded type that a method belongs to.
func (o *oldTypes) ownerOf(m *def) *def {
	o.mu.RLock()
	defer o.mu.RUnlock()
	for t, ms := range o.methods {
		if slices.Contains(ms, m) {
			return t
		}
	}
	return nil
}
