// Command gen writes what a session knows of the packages that it offers to cells: the types for the checker,
// the symbols for the interpreter and the documentation for inspection. The three come from one list, offered.txt.
package main

import (
	"bytes"
	"compress/gzip"
	_ "embed"
	"encoding/json"
	"flag"
	"fmt"
	"go/token"
	"go/types"
	"io"
	"log"
	"os"
	"os/exec"
	"path/filepath"
	"strings"

	"golang.org/x/tools/go/gcexportdata"
)

//go:embed offered.txt
var offered string

// listed is what the go command tells of a package.
type listed struct {
	ImportPath, Name, Dir, Export string
	GoFiles                       []string
	CgoFiles                      []string
}

func main() {
	log.SetFlags(0)
	log.SetPrefix("gen: ")
	dir := flag.String("dir", ".", "the folder of the session's internal packages")
	flag.Parse()
	if err := run(*dir); err != nil {
		log.Fatal(err)
	}
}

func run(dir string) error {
	paths := offeredPaths()
	byPath, err := list(paths)
	if err != nil {
		return err
	}
	pkgs, err := load(paths, byPath)
	if err != nil {
		return err
	}
	if err := writeTypes(filepath.Join(dir, "export", "types.gz"), pkgs); err != nil {
		return err
	}
	if err := writeDocs(filepath.Join(dir, "export", "docs.gz"), paths, byPath); err != nil {
		return err
	}
	if err := os.WriteFile(filepath.Join(dir, "export", "offered.txt"), []byte(offered), 0o644); err != nil {
		return err
	}
	return writeSymbols(filepath.Join(dir, "symbols"), pkgs)
}

// offeredPaths lists the import paths of offered.txt.
func offeredPaths() []string {
	var paths []string
	for line := range strings.Lines(offered) {
		line = strings.TrimPrefix(strings.TrimSpace(line), "+")
		if line != "" && !strings.HasPrefix(line, "#") {
			paths = append(paths, line)
		}
	}
	return paths
}

// list asks the go command for the export data of the packages and of all that they import.
func list(paths []string) (map[string]*listed, error) {
	cmd := exec.Command("go", append([]string{"list", "-export", "-deps",
		"-json=ImportPath,Name,Dir,Export,GoFiles,CgoFiles"}, paths...)...)
	cmd.Stderr = os.Stderr
	out, err := cmd.Output()
	if err != nil {
		return nil, fmt.Errorf("go list: %w", err)
	}
	byPath := map[string]*listed{}
	for dec := json.NewDecoder(bytes.NewReader(out)); ; {
		p := new(listed)
		if err := dec.Decode(p); err == io.EOF {
			return byPath, nil
		} else if err != nil {
			return nil, err
		}
		byPath[p.ImportPath] = p
	}
}

// load reads the types of the packages from their export data.
func load(paths []string, byPath map[string]*listed) ([]*types.Package, error) {
	fset := token.NewFileSet()
	imports := map[string]*types.Package{}
	var pkgs []*types.Package
	for _, path := range paths {
		p := byPath[path]
		if p == nil || p.Export == "" {
			return nil, fmt.Errorf("no export data of %s", path)
		}
		f, err := os.Open(p.Export)
		if err != nil {
			return nil, err
		}
		//lint:ignore SA1019 the go command names archive files
		r, err := gcexportdata.NewReader(f)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", path, err)
		}
		pkg, err := gcexportdata.Read(r, fset, imports, path)
		f.Close()
		if err != nil {
			return nil, fmt.Errorf("%s: %w", path, err)
		}
		pkgs = append(pkgs, pkg)
	}
	return pkgs, nil
}

// writeTypes writes the export data of each package, with what it needs of others, as one compressed JSON object.
func writeTypes(file string, pkgs []*types.Package) error {
	all := map[string][]byte{}
	for _, pkg := range pkgs {
		var b bytes.Buffer
		if err := gcexportdata.Write(&b, token.NewFileSet(), pkg); err != nil {
			return fmt.Errorf("%s: %w", pkg.Path(), err)
		}
		all[pkg.Path()] = b.Bytes()
	}
	data, err := json.Marshal(all)
	if err != nil {
		return err
	}
	return writeCompressed(file, data)
}

func writeCompressed(file string, data []byte) error {
	var b bytes.Buffer
	z, err := gzip.NewWriterLevel(&b, gzip.BestCompression)
	if err != nil {
		return err
	}
	if _, err := z.Write(data); err != nil {
		return err
	}
	if err := z.Close(); err != nil {
		return err
	}
	return os.WriteFile(file, b.Bytes(), 0o644)
}
