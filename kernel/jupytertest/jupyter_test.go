// Package jupytertest drives the kernel with Debian's notebook programs: the
// reference client, its headless runners, the public kernel test kit and the
// console.
package jupytertest

import (
	"encoding/json"
	"fmt"
	"net"
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
	cmd.WaitDelay = time.Second // for kernels that hold its output
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
	need(t, "jupyter_client", "zmq")
	for _, class := range []string{"Cells", "Questions", "Interrupts", "Life", "Sockets"} {
		t.Run(class, func(t *testing.T) {
			if class != "Interrupts" { // which measures time
				t.Parallel()
			}
			script(t, "client.py", "-v", class)
		})
	}
}

// TestKit holds the kernel to the public kernel test kit; a part of it that is
// skipped is a failure here.
func TestKit(t *testing.T) {
	need(t, "jupyter_kernel_test")
	t.Parallel()
	out := script(t, "kit.py", "-v")
	for line := range strings.Lines(out) {
		if strings.Contains(line, "... skipped") && !strings.Contains(line, "test_clear_output") { // no cell can clear its output yet
			t.Error(line)
		}
	}
}

func TestHeadless(t *testing.T) {
	need(t, "nbclient", "nbconvert")
	t.Parallel()
	script(t, "headless.py", "-v")
}

// TestConsole runs beside no other test: the console has timeouts of a second that
// cannot be set.
func TestConsole(t *testing.T) {
	need(t, "jupyter_console", "pexpect")
	script(t, "console.py", "-v")
}

// TestClientsFindTheKernel looks at the kernel as the reference client lists it.
func TestClientsFindTheKernel(t *testing.T) {
	need(t, "jupyter_client")
	t.Parallel()
	out := script(t, "-m", "jupyter_client.kernelspecapp", "list", "--json")
	var list struct {
		Kernelspecs map[string]struct {
			Dir  string `json:"resource_dir"`
			Spec struct {
				Argv          []string
				DisplayName   string `json:"display_name"`
				InterruptMode string `json:"interrupt_mode"`
			}
		}
	}
	start := strings.Index(out, "{") // warnings may come first
	if start < 0 || json.Unmarshal([]byte(out[start:]), &list) != nil {
		t.Fatalf("no list:\n%s", out)
	}
	k := list.Kernelspecs["brinkline"]
	if len(k.Spec.Argv) == 0 || k.Spec.Argv[0] != program || k.Spec.DisplayName != "Brinkline" || k.Spec.InterruptMode != "message" {
		t.Errorf("the client sees %+v", k)
	}
}

// TestAKernelThatCannotStart asks the command for one clear line and exit code 1.
func TestAKernelThatCannotStart(t *testing.T) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	taken := fmt.Sprintf(`{"transport": "tcp", "ip": "127.0.0.1", "key": "", "signature_scheme": "hmac-sha256", "shell_port": 0,
		"iopub_port": 0, "stdin_port": 0, "hb_port": 0, "control_port": %d}`, l.Addr().(*net.TCPAddr).Port)
	for text, want := range map[string]string{
		"{":   "is not a JSON object",
		"{}":  "shell_port is missing",
		taken: "is taken by another program",
	} {
		path := filepath.Join(t.TempDir(), "connection.json")
		if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
		cmd := exec.Command(program, "kernel", path)
		out, _ := cmd.CombinedOutput()
		if cmd.ProcessState.ExitCode() != 1 || strings.Count(string(out), "\n") != 1 || !strings.Contains(string(out), want) {
			t.Errorf("%s: exit code %d and\n%swant 1 and a line with %q", text, cmd.ProcessState.ExitCode(), out, want)
		}
	}
}
