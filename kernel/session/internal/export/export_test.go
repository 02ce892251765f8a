package export

import (
	"bytes"
	"encoding/json"
	"go/token"
	"go/types"
	"io"
	"os"
	"os/exec"
	"strings"
	"testing"

	"golang.org/x/tools/go/gcexportdata"
)

// TestTypesAreCurrent compares the embedded types of this module's own packages with what they are now.
func TestTypesAreCurrent(t *testing.T) {
	own := []string{"brinkline/continuation", "brinkline/display"}
	out, err := exec.Command("go", append([]string{"list", "-export", "-json=ImportPath,Export"}, own...)...).Output()
	if err != nil {
		t.Skipf("the go command cannot list the module's packages: %v", err)
	}
	for dec := json.NewDecoder(bytes.NewReader(out)); ; {
		var p struct{ ImportPath, Export string }
		if err := dec.Decode(&p); err == io.EOF {
			break
		} else if err != nil {
			t.Fatal(err)
		}
		now, embedded := surface(t, readExport(t, p.Export, p.ImportPath)), embeddedSurface(t, p.ImportPath)
		if now != embedded {
			t.Errorf("%s has changed: run go generate ./kernel/session/...\n%s", p.ImportPath, firstDifference(embedded, now))
		}
	}
}

func readExport(t *testing.T, file, path string) *types.Package {
	f, err := os.Open(file)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	//lint:ignore SA1019 the go command names archive files
	r, err := gcexportdata.NewReader(f)
	if err != nil {
		t.Fatal(err)
	}
	pkg, err := gcexportdata.Read(r, token.NewFileSet(), map[string]*types.Package{}, path)
	if err != nil {
		t.Fatal(err)
	}
	return pkg
}

func embeddedSurface(t *testing.T, path string) string {
	pkg, err := NewImporter().Import(path)
	if err != nil {
		t.Fatal(err)
	}
	return surface(t, pkg)
}

// surface writes all that a cell can see of a package.
func surface(t *testing.T, pkg *types.Package) string {
	var b strings.Builder
	for _, name := range pkg.Scope().Names() {
		obj := pkg.Scope().Lookup(name)
		if !obj.Exported() {
			continue
		}
		b.WriteString(declaration(obj) + "\n")
		ms := types.NewMethodSet(types.NewPointer(obj.Type()))
		for i := range ms.Len() {
			if m := ms.At(i).Obj(); m.Exported() {
				b.WriteString("\t" + types.ObjectString(m, (*types.Package).Path) + "\n")
			}
		}
	}
	return b.String()
}

// declaration writes an object; of a struct only the fields that a cell can see.
func declaration(obj types.Object) string {
	st, ok := obj.Type().Underlying().(*types.Struct)
	if _, isType := obj.(*types.TypeName); !isType || !ok {
		return types.ObjectString(obj, (*types.Package).Path)
	}
	out := "type " + obj.Name() + " struct"
	for f := range st.Fields() {
		if f.Exported() {
			out += "; " + types.ObjectString(f, (*types.Package).Path)
		}
	}
	return out
}

func firstDifference(a, b string) string {
	x, y := strings.Split(a, "\n"), strings.Split(b, "\n")
	for i := range min(len(x), len(y)) {
		if x[i] != y[i] {
			return "embedded: " + x[i] + "\nnow:      " + y[i]
		}
	}
	return "one has more names than the other"
}

func TestPackagesOutsideTheListAreRefused(t *testing.T) {
	for _, p := range []string{"unsafe", "net/http", "os/exec", "rand"} {
		if _, err := NewImporter().Import(p); err == nil {
			t.Errorf("%s is offered", p)
		}
	}
}

func TestDocs(t *testing.T) {
	for key, want := range map[string]string{"fmt.Println": "Println formats", "time.Duration.Seconds": "Seconds returns", "math": "math"} {
		if !strings.Contains(Doc(key), want) {
			t.Errorf("%s says %q", key, Doc(key))
		}
	}
}

func BenchmarkReadEveryPackage(b *testing.B) {
	for b.Loop() {
		im := NewImporter()
		for _, p := range Paths() {
			if _, err := im.Import(p); err != nil {
				b.Fatal(err)
			}
		}
	}
}
