package main

import (
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

const top = "../.." // the root of the repository

// imports returns the imports of every Go file of the repository by package
// path, tests included: import path -> the file that has it.
func imports(t *testing.T) map[string]map[string]string {
	t.Helper()
	all := map[string]map[string]string{}
	err := filepath.WalkDir(top, func(path string, d fs.DirEntry, err error) error {
		switch name := d.Name(); {
		case err != nil:
			return err
		case d.IsDir() && path != top && (strings.HasPrefix(name, ".") || name == "testdata"):
			return filepath.SkipDir
		case d.IsDir() || !strings.HasSuffix(name, ".go"):
			return nil
		}
		file, err := parser.ParseFile(token.NewFileSet(), path, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		folder, err := filepath.Rel(top, filepath.Dir(path))
		if err != nil {
			return err
		}
		from := "brinkline/" + filepath.ToSlash(folder)
		if all[from] == nil {
			all[from] = map[string]string{}
		}
		for _, i := range file.Imports {
			to, err := strconv.Unquote(i.Path.Value)
			if err != nil {
				return err
			}
			all[from][to] = path
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return all
}

// within reports whether a package is one of the given ones or below one.
func within(pkg string, folders ...string) bool {
	return slices.ContainsFunc(folders, func(f string) bool { return pkg == f || strings.HasPrefix(pkg, f+"/") })
}

// floors says what must not be imported where.
var floors = []struct {
	why       string
	in        []string // packages the rule holds for
	except    []string // packages below them that it does not hold for
	forbidden []string
}{
	{
		why: "the numerics know no picture and no notebook",
		in:  []string{"brinkline/continuation"}, forbidden: []string{"brinkline/display", "brinkline/kernel", "gonum.org/v1/plot"},
	},
	{
		why: "pictures know no notebook",
		in:  []string{"brinkline/display"}, forbidden: []string{"brinkline/kernel"},
	},
	{
		why: "a session knows no socket, no file format and no front end",
		in:  []string{"brinkline/kernel/session"},
		forbidden: []string{
			"brinkline/kernel/wire", "brinkline/kernel/notebook", "brinkline/kernel/report", "brinkline/kernel/headless",
			"github.com/go-zeromq", "net",
		},
	},
	{
		why: "the wire knows no cell",
		in:  []string{"brinkline/kernel/wire"},
		forbidden: []string{
			"brinkline/kernel/session", "brinkline/kernel/notebook", "brinkline/kernel/report", "brinkline/kernel/headless",
			"brinkline/display", "brinkline/continuation", "github.com/traefik/yaegi", "go/parser", "go/types",
		},
	},
	{
		why: "notebooks and reports know no socket",
		in:  []string{"brinkline/kernel/notebook", "brinkline/kernel/report", "brinkline/kernel/headless"}, forbidden: []string{"brinkline/kernel/wire", "github.com/go-zeromq"},
	},
	{
		why: "only the command knows its flags",
		in:  []string{"brinkline/continuation", "brinkline/display", "brinkline/kernel"}, except: []string{"brinkline/kernel/brinkline"},
		forbidden: []string{"github.com/spf13", "brinkline/kernel/brinkline"},
	},
	{
		why: "only a session interprets",
		in:  []string{"brinkline/continuation", "brinkline/display", "brinkline/kernel"}, except: []string{"brinkline/kernel/session"},
		forbidden: []string{"github.com/traefik/yaegi"},
	},
}

// broken returns a line for each import that breaks a rule, and for each rule
// that holds for no package.
func broken(all map[string]map[string]string) (lines []string) {
	for _, rule := range floors {
		found := false
		for from, imported := range all {
			if !within(from, rule.in...) || within(from, rule.except...) {
				continue
			}
			found = true
			for to, file := range imported {
				if within(to, rule.forbidden...) {
					lines = append(lines, file+" imports "+to+": "+rule.why)
				}
			}
		}
		if !found {
			lines = append(lines, "no package at all is meant by: "+rule.why)
		}
	}
	slices.Sort(lines)
	return lines
}

func TestNoImportPointsUpAFloor(t *testing.T) {
	for _, line := range broken(imports(t)) {
		t.Error(line)
	}
}

func TestAnImportUpAFloorIsFound(t *testing.T) {
	all := imports(t)
	all["brinkline/continuation/new"] = map[string]string{"brinkline/display": "new.go"}
	all["brinkline/kernel/session/new"] = map[string]string{"net/http": "new.go"}
	all["brinkline/kernel/brinkline"]["github.com/spf13/cobra"] = "root.go" // allowed there
	want := []string{
		"new.go imports brinkline/display: the numerics know no picture and no notebook",
		"new.go imports net/http: a session knows no socket, no file format and no front end",
	}
	before := broken(imports(t))
	got := slices.DeleteFunc(broken(all), func(line string) bool { return slices.Contains(before, line) })
	if !slices.Equal(got, want) {
		t.Errorf("found %q\nwant %q", got, want)
	}
}

// The root stays a map of the house. What git does not know (results of runs,
// builds) is not looked at.
func TestRootHoldsTheFiveFoldersAndLittleElse(t *testing.T) {
	allowed := []string{
		"continuation", "display", "kernel", "notebooks-demo", "testdata",
		"go.mod", "go.sum", "README.md", "DEVELOPERS.md", "LICENSE",
	}
	listing, err := exec.Command("git", "-C", top, "ls-files", "-z").Output()
	if err != nil {
		if os.Getenv("BRINKLINE_REQUIRE_ALL") == "1" {
			t.Fatalf("git ls-files: %v", err)
		}
		t.Skip("this is no git checkout: git ls-files does not work")
	}
	seen := map[string]bool{}
	for path := range strings.SplitSeq(strings.TrimSuffix(string(listing), "\x00"), "\x00") {
		entry, _, _ := strings.Cut(path, "/")
		if seen[entry] || strings.HasPrefix(entry, ".") {
			continue
		}
		seen[entry] = true
		if !slices.Contains(allowed, entry) {
			t.Errorf("%s does not belong in the root", entry)
		}
	}
	if len(seen) == 0 {
		t.Error("git lists no file")
	}
}
