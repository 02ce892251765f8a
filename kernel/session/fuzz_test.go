package session

import (
	"os"
	"path/filepath"
	"testing"
)

// FuzzCell looks for cells that make the splitter, the checker or the lowering panic, or that the interpreter refuses although the
// checker accepts them. Nothing is run.
func FuzzCell(f *testing.F) {
	files, err := filepath.Glob("testdata/*.txtar")
	if err != nil {
		f.Fatal(err)
	}
	for _, file := range files {
		data, err := os.ReadFile(file)
		if err != nil {
			f.Fatal(err)
		}
		for _, sc := range scripts(string(data)) {
			for _, step := range sc.steps {
				if step.Name == "cell" {
					f.Add(string(step.Data))
				}
			}
		}
	}
	f.Fuzz(func(t *testing.T, text string) {
		s, err := New(Options{})
		if err != nil {
			t.Fatal(err)
		}
		defer s.Close()
		s.IsComplete(text)
		s.Complete(text, len([]rune(text))/2)
		sp, perr := splitCell(newSource("", 1, text))
		if perr != nil {
			return
		}
		u := newUnit(s, sp)
		if u.check() != nil {
			return
		}
		low, lerr := u.lower()
		if lerr != nil {
			return // refused with a reason of its own
		}
		if _, err := s.machine.compile(low.file); err != nil {
			t.Errorf("the checker accepts what the interpreter refuses: %v", err)
		}
	})
}
