// Package export holds the types and the documentation of the offered packages, as data that the checker and inspection read.
package export

import (
	"bytes"
	"compress/gzip"
	_ "embed"
	"encoding/json"
	"fmt"
	"go/token"
	"go/types"
	"io"
	"path"
	"sort"
	"strings"
	"sync"

	"golang.org/x/tools/go/gcexportdata"
)

//go:embed types.gz
var typesData []byte

//go:embed docs.gz
var docsData []byte

//go:embed offered.txt
var offered string

var allTypes = sync.OnceValues(func() (map[string][]byte, error) {
	m := map[string][]byte{}
	return m, unpack(typesData, &m)
})

var allDocs = sync.OnceValue(func() map[string]string {
	m := map[string]string{}
	if err := unpack(docsData, &m); err != nil {
		return nil // inspection then shows types only
	}
	return m
})

func unpack(data []byte, into any) error {
	z, err := gzip.NewReader(bytes.NewReader(data))
	if err != nil {
		return err
	}
	raw, err := io.ReadAll(z)
	if err != nil {
		return err
	}
	return json.Unmarshal(raw, into)
}

// Importer gives the checker the types of offered packages. It is safe for concurrent use.
type Importer struct {
	mu     sync.Mutex
	fset   *token.FileSet
	loaded map[string]*types.Package // all packages seen, also those only referred to
	whole  map[string]*types.Package // those read themselves
}

// NewImporter returns an importer without any package read.
func NewImporter() *Importer {
	return &Importer{fset: token.NewFileSet(), loaded: map[string]*types.Package{}, whole: map[string]*types.Package{}}
}

// Import returns the package with the given path; it fails for one that is not offered.
func (im *Importer) Import(p string) (*types.Package, error) {
	if p == "unsafe" {
		return nil, fmt.Errorf("package %q is not offered to cells", p)
	}
	im.mu.Lock()
	defer im.mu.Unlock()
	if pkg, ok := im.whole[p]; ok {
		return pkg, nil
	}
	all, err := allTypes()
	if err != nil {
		return nil, err
	}
	data, ok := all[p]
	if !ok {
		return nil, fmt.Errorf("package %q is not offered to cells%s", p, nearestHint(p))
	}
	pkg, err := gcexportdata.Read(bytes.NewReader(data), im.fset, im.loaded, p)
	if err != nil {
		return nil, fmt.Errorf("package %q: %w", p, err)
	}
	im.whole[p] = pkg
	return pkg, nil
}

// nearestHint names an offered package with the same last element.
func nearestHint(p string) string {
	for _, q := range Paths() {
		if path.Base(q) == path.Base(p) {
			return fmt.Sprintf(" (did you mean %q?)", q)
		}
	}
	return ""
}

// Doc returns the documentation of a name: "fmt", "fmt.Println", "time.Time.Add".
func Doc(key string) string { return allDocs()[key] }

// Paths lists the import paths of all offered packages.
func Paths() []string {
	var paths []string
	for _, p := range lines() {
		paths = append(paths, strings.TrimPrefix(p, "+"))
	}
	sort.Strings(paths)
	return paths
}

// Preloaded maps the names that need no import to their import paths.
var Preloaded = sync.OnceValue(func() map[string]string {
	m := map[string]string{}
	for _, p := range lines() {
		if q, ok := strings.CutPrefix(p, "+"); ok {
			m[path.Base(q)] = q
		}
	}
	return m
})

func lines() []string {
	var out []string
	for line := range strings.Lines(offered) {
		line = strings.TrimSpace(line)
		if line != "" && !strings.HasPrefix(line, "#") {
			out = append(out, line)
		}
	}
	return out
}
