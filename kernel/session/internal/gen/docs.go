package main

import (
	"encoding/json"
	"go/ast"
	"go/doc"
	"go/parser"
	"go/token"
	"path/filepath"
)

// writeDocs writes the documentation of every exported name, keyed "path.Name" and "path.Type.Method", the package's own under "path".
func writeDocs(file string, paths []string, byPath map[string]*listed) error {
	docs := map[string]string{}
	for _, path := range paths {
		if err := addDocs(docs, byPath[path]); err != nil {
			return err
		}
	}
	data, err := json.Marshal(docs)
	if err != nil {
		return err
	}
	return writeCompressed(file, data)
}

func addDocs(docs map[string]string, p *listed) error {
	fset := token.NewFileSet()
	var files []*ast.File
	for _, name := range p.GoFiles {
		f, err := parser.ParseFile(fset, filepath.Join(p.Dir, name), nil, parser.ParseComments)
		if err != nil {
			return err
		}
		files = append(files, f)
	}
	d, err := doc.NewFromFiles(fset, files, p.ImportPath)
	if err != nil {
		return err
	}
	put := func(name, text string) {
		if text != "" {
			docs[p.ImportPath+name] = text
		}
	}
	put("", d.Synopsis(d.Doc))
	putValues := func(vs []*doc.Value) {
		for _, v := range vs {
			for _, name := range v.Names {
				put("."+name, v.Doc)
			}
		}
	}
	putFuncs := func(prefix string, fs []*doc.Func) {
		for _, f := range fs {
			put(prefix+f.Name, f.Doc)
		}
	}
	putValues(d.Consts)
	putValues(d.Vars)
	putFuncs(".", d.Funcs)
	for _, t := range d.Types {
		put("."+t.Name, t.Doc)
		putValues(t.Consts)
		putValues(t.Vars)
		putFuncs(".", t.Funcs)
		putFuncs("."+t.Name+".", t.Methods)
		putFields(put, t)
	}
	return nil
}

// putFields adds the comments of a struct's fields, which carry the units.
func putFields(put func(name, text string), t *doc.Type) {
	for _, spec := range t.Decl.Specs {
		ts, ok := spec.(*ast.TypeSpec)
		if !ok {
			continue
		}
		st, ok := ts.Type.(*ast.StructType)
		if !ok {
			continue
		}
		for _, f := range st.Fields.List {
			text := f.Doc.Text()
			if text == "" {
				text = f.Comment.Text()
			}
			for _, name := range f.Names {
				if name.IsExported() {
					put("."+t.Name+"."+name.Name, text)
				}
			}
		}
	}
}
