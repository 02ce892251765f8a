// Package jupytertest drives the kernel with Debian's notebook programs: the
// reference client, its headless runners, the public kernel test kit and the
// console.
package jupytertest

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// python is Debian's, which has the notebook programs.
const python = "/usr/bin/python3"

// program is the command under test, built and registered once for all tests.
var program string

func TestMain(m *testing.M) { os.Exit(run(m)) }

func run(m *testing.M) int {
	dir, err := os.MkdirTemp("", "brinkline-*")
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		return 1
	}
	defer os.RemoveAll(dir)
	program = filepath.Join(dir, "brinkline")
	for variable, folder := range map[string]string{
		"JUPYTER_DATA_DIR": "data", "JUPYTER_RUNTIME_DIR": "run", "JUPYTER_CONFIG_DIR": "config", "IPYTHONDIR": "ipython",
	} {
		os.Setenv(variable, filepath.Join(dir, folder))
	}
	for _, command := range [][]string{
		{"go", "build", "-o", program, "brinkline/kernel/brinkline"},
		{program, "register"},
	} {
		if out, err := exec.Command(command[0], command[1:]...).CombinedOutput(); err != nil {
			fmt.Fprintf(os.Stderr, "%s: %v\n%s", strings.Join(command, " "), err, out)
			return 1
		}
	}
	return m.Run()
}

// need skips the test when python modules are missing, or fails it where
// everything must be there.
func need(t *testing.T, modules ...string) {
	t.Helper()
	out, err := exec.Command(python, "-c", "import "+strings.Join(modules, ", ")).CombinedOutput()
	if err == nil {
		return
	}
	reason := fmt.Sprintf("%s cannot import %s: %v\n%s", python, strings.Join(modules, ", "), err, out)
	if os.Getenv("BRINKLINE_REQUIRE_ALL") == "1" {
		t.Fatal(reason)
	}
	t.Skip(reason)
}

// script runs a script of testdata, which must succeed, and returns its output.
func script(t *testing.T, args ...string) string {
	t.Helper()
	cmd := exec.Command(python, args...)
	cmd.Dir = "testdata"
	cmd.Env = append(os.Environ(), "PYTHONDONTWRITEBYTECODE=1", "PYTHONWARNINGS=ignore")
	limit := time.AfterFunc(2*time.Minute, func() { cmd.Process.Kill() })
	out, err := cmd.CombinedOutput()
	if !limit.Stop() {
		t.Error("the script was ended after 2 minutes")
	}
	if err != nil {
		t.Errorf("%s: %v\n%s", strings.Join(args, " "), err, out)
	}
	return string(out)
}

func TestClient(t *testing.T) {
	need(t, "jupyter_client")
	for _, class := range []string{"Cells", "Questions", "Interrupts", "Life"} {
		t.Run(class, func(t *testing.T) { script(t, "client.py", "-v", class) })
	}
}

// TestKit holds the kernel to the public kernel test kit; a part of it that is
// skipped is a failure here.
func TestKit(t *testing.T) {
	need(t, "jupyter_kernel_test")
	out := script(t, "kit.py", "-v")
	for line := range strings.Lines(out) {
		if strings.Contains(line, "skipped") && !strings.Contains(line, "test_clear_output") { // no cell can clear its output yet
			t.Error(line)
		}
	}
}
