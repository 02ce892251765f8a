package kernel

import (
	"context"
	"path"
	"strings"
	"sync"

	"brinkline/kernel/wire"
)

// history holds the cells that were run in this session and what they showed.
// It also counts them.
type history struct {
	mu      sync.Mutex
	entries []entry // entries[i] has the number i+1
}

type entry struct {
	number         int
	source, output string
}

// count returns the number of the last cell, 0 before the first.
func (h *history) count() int {
	h.mu.Lock()
	defer h.mu.Unlock()
	return len(h.entries)
}

// add enters a cell and returns its number.
func (h *history) add(source string) int {
	h.mu.Lock()
	defer h.mu.Unlock()
	n := len(h.entries) + 1
	h.entries = append(h.entries, entry{number: n, source: source})
	return n
}

// setOutput notes what the cell of a number showed.
func (h *history) setOutput(number int, text string) {
	h.mu.Lock()
	defer h.mu.Unlock()
	h.entries[number-1].output = text
}

// historyRequest is the content of a history_request.
type historyRequest struct {
	Access  string `json:"hist_access_type"` // range, tail or search
	Output  bool
	Session int // 0 is this one, which is also 1
	Start   int
	Stop    *int
	N       int
	Pattern string
	Unique  bool
}

func (k *kernel) historyReply(_ context.Context, m *wire.Message) content {
	var r historyRequest
	if bad := read(m, &r); bad != nil {
		return bad
	}
	list := []any{}
	for _, e := range k.history.find(r) {
		if r.Output {
			list = append(list, []any{1, e.number, []any{e.source, orNull(e.output)}})
		} else {
			list = append(list, []any{1, e.number, e.source})
		}
	}
	return content{"status": "ok", "history": list}
}

func orNull(s string) any {
	if s == "" {
		return nil
	}
	return s
}

// find returns the entries that a request asks for, the oldest first.
func (h *history) find(r historyRequest) []entry {
	h.mu.Lock()
	defer h.mu.Unlock()
	switch r.Access {
	case "range":
		return h.between(r)
	case "search":
		return last(matching(h.entries, r), r.N)
	default: // tail
		return last(h.entries, r.N)
	}
}

// between returns the entries from Start up to, not including, Stop.
func (h *history) between(r historyRequest) []entry {
	if r.Session != 0 && r.Session != 1 {
		return nil
	}
	from, to := max(r.Start, 1), len(h.entries)+1
	if r.Stop != nil {
		to = min(to, *r.Stop)
	}
	if from >= to {
		return nil
	}
	return h.entries[from-1 : to-1]
}

// last returns the n last of es, all when n is not positive.
func last(es []entry, n int) []entry {
	if n <= 0 || n > len(es) {
		return es
	}
	return es[len(es)-n:]
}

// matching returns the entries whose source matches a pattern with * and ?.
// Unique keeps the latest of equal ones.
func matching(es []entry, r historyRequest) (found []entry) {
	latest := make(map[string]int)
	for i, e := range es {
		latest[e.source] = i
	}
	for i, e := range es {
		if glob(r.Pattern, e.source) && (!r.Unique || latest[e.source] == i) {
			found = append(found, e)
		}
	}
	return found
}

// glob reports whether s matches pattern, in which * stands for any text and ?
// for one character.
func glob(pattern, s string) bool {
	hide := strings.NewReplacer("/", "\x00") // path.Match stops * at a slash
	pattern = strings.NewReplacer(`\`, `\\`, "[", `\[`).Replace(pattern)
	ok, err := path.Match(hide.Replace(pattern), hide.Replace(s))
	return ok && err == nil
}
