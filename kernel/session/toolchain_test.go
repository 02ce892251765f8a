package session

import (
	"bytes"
	"context"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"brinkline/kernel/session/internal/export"
)

// The run tests of the Go toolchain, cut into cells by their top-level declarations, with a call of main as the last cell.
//
// TestToolchain needs BRINKLINE_LONG=1 and $GOROOT/test. Each program runs in a process of its own, for some are made to end one.
// testdata/toolchain.list names those that pass; with BRINKLINE_TOOLCHAIN=write the list is written anew, and with
// BRINKLINE_TOOLCHAIN set to a path's part only those programs run.

// runTests lists the single-file programs that use only packages which the session offers.
func runTests(t *testing.T) []string {
	root := toolchainTests(t)
	if _, err := os.Stat(root); err != nil {
		t.Skipf("the toolchain's tests are not installed: %v", err)
	}
	var out []string
	err := filepath.WalkDir(root, func(p string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() || !strings.HasSuffix(p, ".go") {
			return err
		}
		if suitable(p) {
			rel, _ := filepath.Rel(root, p)
			out = append(out, rel)
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	slices.Sort(out)
	return out
}

// toolchainTests is the folder of the toolchain's own tests.
func toolchainTests(t *testing.T) string {
	out, err := exec.Command("go", "env", "GOROOT").Output()
	if err != nil {
		t.Skipf("no go command: %v", err)
	}
	return filepath.Join(strings.TrimSpace(string(out)), "test")
}

func suitable(file string) bool {
	data, err := os.ReadFile(file)
	if err != nil {
		return false
	}
	first, _, _ := strings.Cut(string(data), "\n")
	if strings.TrimSpace(first) != "// run" || bytes.Contains(data, []byte("go:build")) || bytes.Contains(data, []byte("go:linkname")) {
		return false
	}
	f, err := parser.ParseFile(token.NewFileSet(), file, data, parser.ImportsOnly)
	if err != nil || f.Name.Name != "main" {
		return false
	}
	offered := export.Paths()
	for _, im := range f.Imports {
		if !slices.Contains(offered, strings.Trim(im.Path.Value, `"`)) {
			return false
		}
	}
	return true
}

// programCells cuts a program into cells.
func programCells(file string) ([]string, error) {
	data, err := os.ReadFile(file)
	if err != nil {
		return nil, err
	}
	fset := token.NewFileSet()
	f, err := parser.ParseFile(fset, file, data, parser.ParseComments)
	if err != nil {
		return nil, err
	}
	var cells []string
	inits := 0
	for _, d := range f.Decls {
		text := string(data[fset.Position(d.Pos()).Offset:fset.Position(d.End()).Offset])
		if fd, ok := d.(*ast.FuncDecl); ok && fd.Recv == nil && fd.Name.Name == "init" {
			text = strings.Replace(text, "init", fmt.Sprint("initially", inits), 1) + fmt.Sprintf("\ninitially%d()", inits)
			inits++
		}
		cells = append(cells, text)
	}
	return append(cells, "main()"), nil
}

// wantedOutput is what a program must print.
func wantedOutput(file string) string {
	data, err := os.ReadFile(strings.TrimSuffix(file, ".go") + ".out")
	if err != nil {
		return ""
	}
	return string(data)
}

// TestToolchainOne runs one program; it is the child of TestToolchain.
func TestToolchainOne(t *testing.T) {
	file := os.Getenv("BRINKLINE_TOOLCHAIN_FILE")
	if file == "" {
		t.Skip("runs as a child of TestToolchain")
	}
	cells, err := programCells(file)
	if err != nil {
		t.Fatal(err)
	}
	s, err := New(Options{})
	if err != nil {
		t.Fatal(err)
	}
	out := &plainOutput{}
	ctx, cancel := context.WithTimeout(t.Context(), 15*time.Second)
	defer cancel()
	for i, c := range cells {
		if res := s.Run(ctx, Cell{Number: i + 1, Source: c}, out); res.Err != nil {
			fmt.Printf("FAILED: %s: %s (line %d)\n", res.Err.Name, res.Err.Message, res.Err.Line)
			return
		}
	}
	got := out.text()
	if want := wantedOutput(file); got != want {
		fmt.Printf("FAILED: output differs: %q, want %q\n", clip(got), clip(want))
		return
	}
	fmt.Println("PASSED")
}

func clip(s string) string {
	if len(s) > 300 {
		return s[:300]
	}
	return s
}

// plainOutput keeps both streams as a program would print them.
type plainOutput struct{ recorder }

// Stream leaves out the session's own notes on what is not defined yet.
func (o *plainOutput) Stream(name, text string) {
	if !strings.HasPrefix(text, "note: ") {
		o.recorder.Stream("stdout", text)
	}
}

func runProgram(file string) string {
	ctx, cancel := context.WithTimeout(context.Background(), 40*time.Second)
	defer cancel()
	cmd := exec.CommandContext(ctx, os.Args[0], "-test.run=^TestToolchainOne$", "-test.v")
	cmd.Env = append(os.Environ(), "BRINKLINE_TOOLCHAIN_FILE="+file)
	out, _ := cmd.CombinedOutput()
	for line := range strings.Lines(string(out)) {
		if strings.HasPrefix(line, "PASSED") || strings.HasPrefix(line, "FAILED") {
			return strings.TrimSpace(line)
		}
	}
	if ctx.Err() != nil {
		return "FAILED: hangs"
	}
	text := string(out)
	if i := strings.Index(text, "fatal error"); i >= 0 {
		text = text[i:]
	} else if i := strings.Index(text, "panic:"); i >= 0 {
		text = text[i:]
	}
	return "FAILED: ends the process: " + clip(strings.ReplaceAll(text, "\n", " "))
}

func TestToolchain(t *testing.T) {
	if os.Getenv("BRINKLINE_LONG") == "" {
		t.Skip("long: set BRINKLINE_LONG=1")
	}
	only := os.Getenv("BRINKLINE_TOOLCHAIN")
	list := runTests(t)
	root := toolchainTests(t)
	results := map[string]string{}
	var mu sync.Mutex
	var wg sync.WaitGroup
	work := make(chan string)
	for range runtime.NumCPU() {
		wg.Go(func() {
			for rel := range work {
				r := runProgram(filepath.Join(root, rel))
				mu.Lock()
				results[rel] = r
				mu.Unlock()
			}
		})
	}
	for _, rel := range list {
		if only == "" || only == "write" || strings.Contains(rel, only) {
			work <- rel
		}
	}
	close(work)
	wg.Wait()
	judge(t, list, results, only == "write")
}

// reason shortens why a program fails for the list.
func reason(r string) string {
	r = strings.TrimPrefix(r, "FAILED: ")
	if strings.HasPrefix(r, "ends the process") {
		return "ends the process"
	}
	if len(r) > 140 {
		r = r[:140]
	}
	return strings.ToValidUTF8(r, "")
}

// judge compares the results with the list of those that must pass.
func judge(t *testing.T, list []string, results map[string]string, write bool) {
	const file = "testdata/toolchain.list"
	must := map[string]bool{}
	data, _ := os.ReadFile(file)
	for line := range strings.Lines(string(data)) {
		name, verdict, _ := strings.Cut(strings.TrimSpace(line), " ")
		must[name] = verdict == "passes"
	}
	passed := 0
	var b strings.Builder
	for _, rel := range list {
		r, ran := results[rel]
		if !ran {
			continue
		}
		if r == "PASSED" {
			passed++
			fmt.Fprintf(&b, "%s passes\n", rel)
			continue
		}
		fmt.Fprintf(&b, "%s %s\n", rel, reason(r))
		if must[rel] {
			t.Errorf("%s: %s", rel, r)
		}
	}
	t.Logf("%d of %d programs pass", passed, len(results))
	if write {
		if err := os.WriteFile(file, []byte(b.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}
