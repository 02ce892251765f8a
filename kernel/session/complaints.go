package session

import (
	"regexp"
	"strings"
	"sync"
)

// complaints receives what the interpreter prints by itself: a line for each of its functions that a panic leaves.
type complaints struct {
	mu     sync.Mutex
	frames []string
}

var frameRE = regexp.MustCompile(`panic: main\.([^(\s]*)\(`)

// Write keeps the names of the functions.
func (c *complaints) Write(p []byte) (int, error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	if m := frameRE.FindSubmatch(p); m != nil && len(c.frames) < 64 {
		c.frames = append(c.frames, string(m[1]))
	}
	return len(p), nil
}

// take returns the functions that the last panic left, innermost first, by the names that the cells gave them.
func (c *complaints) take() []string {
	c.mu.Lock()
	defer c.mu.Unlock()
	var out []string
	for _, f := range c.frames {
		name := f
		lit := strings.HasSuffix(f, ".func")
		parts := strings.Split(strings.TrimSuffix(f, ".func"), mark)
		switch {
		case len(parts) >= 3 && parts[1] != "" && parts[1][0] >= 'A':
			name = parts[0] + "." + parts[1]
		default:
			name = parts[0]
		}
		if name == "init" || name == "" || name == "main" {
			continue
		}
		if lit {
			name = "a function in " + name
		}
		if len(out) == 0 || out[len(out)-1] != name {
			out = append(out, name)
		}
	}
	c.frames = nil
	return out
}
