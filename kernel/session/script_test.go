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
//
// With BRINKLINE_UPDATE=1 the wants are written from what comes out, to be read before they are kept.
func TestScripts(t *testing.T) {
	if os.Getenv("BRINKLINE_UPDATE") != "" {
		updateScripts(t)
	}
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

// updateScripts writes what the cells give after each cell that has no want yet.
func updateScripts(t *testing.T) {
	files, _ := filepath.Glob("testdata/*.txtar")
	for _, file := range files {
		data, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		head, _, _ := strings.Cut("\n"+string(data), "\n== ")
		out := strings.TrimPrefix(head, "\n")
		if out != "" {
			out += "\n"
		}
		for _, sc := range scripts(string(data)) {
			out += "== " + strings.ReplaceAll(sc.name, "_", " ") + "\n" + filled(t, sc)
		}
		if err := os.WriteFile(file, []byte(out), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

func filled(t *testing.T, sc script) string {
	s, err := New(Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	n, out := 0, ""
	for i, f := range sc.steps {
		out += "-- " + f.Name + " --\n" + string(f.Data)
		if f.Name != "cell" {
			continue
		}
		n++
		got := runCell(s, n, string(f.Data))
		if i+1 >= len(sc.steps) || sc.steps[i+1].Name == "cell" {
			out += "-- want --\n" + got
		}
	}
	return out
}
