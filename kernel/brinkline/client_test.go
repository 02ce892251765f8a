package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// python is Debian's, which has the reference clients.
const python = "/usr/bin/python3"

// needClients skips a test, or fails it where everything must be there, when
// the reference clients are missing.
func needClients(t *testing.T) {
	t.Helper()
	err := exec.Command(python, "-c", "import nbclient, nbconvert, jupyter_client").Run()
	if err == nil {
		return
	}
	if os.Getenv("BRINKLINE_REQUIRE_ALL") == "1" {
		t.Fatalf("nbclient or nbconvert is missing: %v", err)
	}
	t.Skip("nbclient and nbconvert, the reference clients, are not installed")
}

// buildAndRegister builds the command and registers it for the test alone.
func buildAndRegister(t *testing.T) (program string) {
	t.Helper()
	folder := t.TempDir()
	program = filepath.Join(folder, "brinkline")
	t.Setenv("JUPYTER_DATA_DIR", filepath.Join(folder, "data"))
	t.Setenv("JUPYTER_RUNTIME_DIR", filepath.Join(folder, "runtime"))
	command(t, "go", "build", "-o", program, ".")
	command(t, program, "register")
	return program
}

func command(t *testing.T, name string, args ...string) {
	t.Helper()
	if output, err := exec.Command(name, args...).CombinedOutput(); err != nil {
		t.Fatalf("%s %q: %v\n%s", name, args, err, output)
	}
}

// What a notebook holds after `brinkline run` is what the reference clients make
// of it through the kernel: nbclient, and nbconvert --execute.
func TestRunGivesWhatTheClientsGet(t *testing.T) {
	needClients(t)
	demos, err := filepath.Glob("../../notebooks-demo/*.ipynb")
	if err != nil {
		t.Fatal(err)
	}
	program := buildAndRegister(t)
	for _, notebook := range append(demos, "testdata/client.ipynb") {
		t.Run(filepath.Base(notebook), func(t *testing.T) {
			folder := t.TempDir()
			ours := filepath.Join(folder, "ours.ipynb")
			command(t, program, "run", notebook, "-o", ours)
			for _, client := range []string{"nbclient", "nbconvert"} {
				theirs := filepath.Join(folder, client+".ipynb")
				command(t, python, "testdata/client.py", client, notebook, theirs)
				compareFiles(t, client, theirs, ours)
			}
		})
	}
}

func compareFiles(t *testing.T, client, theirs, ours string) {
	t.Helper()
	a, err := os.ReadFile(theirs)
	if err != nil {
		t.Fatal(err)
	}
	b, err := os.ReadFile(ours)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(a, b) {
		t.Errorf("%s and brinkline run differ (-%s +ours):\n%s", client, client, cmp.Diff(string(a), string(b)))
	}
}
