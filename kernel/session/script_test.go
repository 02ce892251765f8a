package session

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/txtar"

	"brinkline/display"
)

// recorder is an Output that keeps what a cell shows.
type recorder struct {
	mu  sync.Mutex
	buf bytes.Buffer
}

func (r *recorder) Stream(name, text string) {
	r.mu.Lock()
	defer r.mu.Unlock()
	if name == "stderr" {
		text = "stderr: " + text
	}
	r.buf.WriteString(text)
}

func (r *recorder) Display(b display.Bundle, id string) {
	r.mu.Lock()
	defer r.mu.Unlock()
	fmt.Fprintf(&r.buf, "display: %s\n", b.Text())
}

func (r *recorder) Update(b display.Bundle, id string) {}
func (r *recorder) Clear(wait bool)                    {}

func (r *recorder) text() string {
	r.mu.Lock()
	defer r.mu.Unlock()
	return r.buf.String()
}

// transcript writes what running a cell gives, as the scripts in testdata expect it.
func transcript(res Result, out string) string {
	var b strings.Builder
	b.WriteString(out)
	if out != "" && !strings.HasSuffix(out, "\n") {
		b.WriteByte('\n')
	}
	if res.Value != nil {
		fmt.Fprintf(&b, "value: %s\n", res.Value.Text())
	}
	if e := res.Err; e != nil {
		fmt.Fprintf(&b, "error: %d:%d: %s: %s\n", e.Line, e.Column, e.Name, e.Message)
		if e.Hint != "" {
			fmt.Fprintf(&b, "hint: %s\n", e.Hint)
		}
	}
	return b.String()
}

// TestScripts runs every script in testdata. A script is a txtar archive: files "cell" are run in order in one session, and the file
// "want" after a cell says what it must show.
func TestScripts(t *testing.T) {
	files, err := filepath.Glob("testdata/*.txtar")
	if err != nil || len(files) == 0 {
		t.Fatalf("no scripts: %v", err)
	}
	for _, file := range files {
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		for _, sc := range scripts(string(data)) {
			t.Run(strings.TrimSuffix(filepath.Base(file), ".txtar")+"/"+sc.name, func(t *testing.T) { runScript(t, sc) })
		}
	}
}

type script struct {
	name  string
	steps []txtar.File
}

// scripts cuts a file at its "== name" lines.
func scripts(text string) []script {
	var out []script
	for _, part := range strings.Split("\n"+text, "\n== ")[1:] {
		name, body, _ := strings.Cut(part, "\n")
		out = append(out, script{strings.ReplaceAll(strings.TrimSpace(name), " ", "_"), txtar.Parse([]byte(body)).Files})
	}
	return out
}

func runScript(t *testing.T, sc script) {
	s, err := New(Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	n := 0
	got := ""
	for _, f := range sc.steps {
		switch f.Name {
		case "cell":
			n++
			got = runCell(s, n, string(f.Data))
		case "want":
			if want := string(f.Data); strings.TrimSpace(got) != strings.TrimSpace(want) {
				t.Errorf("cell %d gave\n%s\nwant\n%s", n, got, want)
			}
		default:
			t.Fatalf("a script has cells and wants, not %q", f.Name)
		}
	}
}

func runCell(s *Session, n int, source string) string {
	ctx, cancel := context.WithTimeout(context.Background(), 20*time.Second)
	defer cancel()
	out := &recorder{}
	res := s.Run(ctx, Cell{ID: fmt.Sprint("c", n), Number: n, Source: strings.TrimSuffix(source, "\n")}, out)
	return transcript(res, out.text())
}
