package kernel

import (
	"context"
	"runtime"
	"strings"
	"unicode/utf8"

	"brinkline/display"
	"brinkline/kernel/wire"
)

// Version is the version of Brinkline.
const Version = "0.1.0"

// LanguageInfo describes the language of the cells, as kernel_info tells it and
// as notebooks keep it.
func LanguageInfo() map[string]any {
	return map[string]any{
		"name":               "go",
		"version":            strings.TrimPrefix(runtime.Version(), "go"),
		"mimetype":           "text/x-go",
		"file_extension":     ".go",
		"pygments_lexer":     "go",
		"codemirror_mode":    "go",
		"nbconvert_exporter": "script",
	}
}

func (k *kernel) info(context.Context, *wire.Message) content {
	return content{
		"status":                 "ok",
		"protocol_version":       wire.ProtocolVersion,
		"implementation":         "brinkline",
		"implementation_version": Version,
		"language_info":          LanguageInfo(),
		"banner":                 "Brinkline " + Version + ": how far a parameter can be pushed before a steady state vanishes",
		"debugger":               false,
		"supported_features":     []string{},
		"help_links": []content{
			{"text": "The Go Language", "url": "https://go.dev/ref/spec"},
			{"text": "Go standard library", "url": "https://pkg.go.dev/std"},
		},
	}
}

func (k *kernel) connect(context.Context, *wire.Message) content {
	c := k.sockets.Connection()
	return content{
		"status":       "ok",
		"shell_port":   c.Shell,
		"iopub_port":   c.IOPub,
		"stdin_port":   c.Stdin,
		"control_port": c.Control,
		"hb_port":      c.Heartbeat,
	}
}

func (k *kernel) isComplete(_ context.Context, m *wire.Message) content {
	var r struct{ Code string }
	if bad := read(m, &r); bad != nil {
		return bad
	}
	status, indent := k.executor.IsComplete(r.Code)
	if status == "incomplete" {
		return content{"status": status, "indent": indent}
	}
	return content{"status": status}
}

// cursorRequest is the content of the requests about a place in a cell.
type cursorRequest struct {
	Code   string
	Cursor *int `json:"cursor_pos"`
}

// cursor returns the place in code points, inside the code.
func (r cursorRequest) cursor() int {
	n := utf8.RuneCountInString(r.Code)
	if r.Cursor == nil {
		return n
	}
	return max(0, min(n, *r.Cursor))
}

func (k *kernel) complete(_ context.Context, m *wire.Message) content {
	var r cursorRequest
	if bad := read(m, &r); bad != nil {
		return bad
	}
	c := k.executor.Complete(r.Code, r.cursor())
	if c.Matches == nil {
		c.Matches = []string{}
	}
	return content{
		"status":       "ok",
		"matches":      c.Matches,
		"cursor_start": c.Start,
		"cursor_end":   c.End,
		"metadata":     content{},
	}
}

func (k *kernel) inspect(_ context.Context, m *wire.Message) content {
	var r cursorRequest
	if bad := read(m, &r); bad != nil {
		return bad
	}
	b, found := k.executor.Inspect(r.Code, r.cursor())
	if !found {
		b = display.Bundle{}
	}
	return content{"status": "ok", "found": found, "data": object(b.Data), "metadata": object(b.Metadata)}
}

// object returns m, or an empty map in the place of nil, which JSON would turn
// into null.
func object(m map[string]any) map[string]any {
	if m == nil {
		return map[string]any{}
	}
	return m
}

// commInfo lists the open comms. This kernel has no comm targets, so none is.
func (k *kernel) commInfo(context.Context, *wire.Message) content {
	return content{"status": "ok", "comms": content{}}
}

// commOpen closes the comm at once, as the protocol asks for unknown targets.
func (k *kernel) commOpen(_ context.Context, m *wire.Message) content {
	var r struct {
		ID     string `json:"comm_id"`
		Target string `json:"target_name"`
	}
	if bad := read(m, &r); bad == nil {
		k.log.Printf("no comm target %q; the comm was closed", r.Target)
		k.publish(m, "comm_close", content{"comm_id": r.ID, "data": content{}})
	}
	return nil
}

// commIgnore takes messages for comms that are not open.
func (k *kernel) commIgnore(context.Context, *wire.Message) content { return nil }
