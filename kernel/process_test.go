//go:build unix

package kernel

import (
	"bytes"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"brinkline/kernel/internal/protocoltest"
)

// child starts the test binary as a kernel, in a process of its own.
func child(t *testing.T, path string) (*exec.Cmd, *bytes.Buffer) {
	t.Helper()
	program, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	var stderr bytes.Buffer
	cmd := exec.Command(program)
	cmd.Env = append(os.Environ(), fakeKernel+"="+path)
	cmd.Stderr = &stderr
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { cmd.Process.Kill() })
	return cmd, &stderr
}

// wait returns the exit code of a process that must end within d.
func wait(t *testing.T, cmd *exec.Cmd, d time.Duration) int {
	t.Helper()
	kill := time.AfterFunc(d, func() { cmd.Process.Kill() })
	err := cmd.Wait()
	if !kill.Stop() {
		t.Errorf("the process had not ended after %v", d)
	}
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		t.Fatal(err)
	}
	return cmd.ProcessState.ExitCode()
}

func hangUp(c *protocoltest.Client) {
	for _, s := range c.Socket {
		s.Close()
	}
}

func TestSIGINTEndsTheCellAndSIGTERMTheKernel(t *testing.T) {
	dir := t.TempDir()
	path := protocoltest.WriteConnection(t, map[string]any{"transport": "ipc", "ip": filepath.Join(dir, "k")})
	cmd, stderr := child(t, path)
	c := protocoltest.Dial(t, path)
	c.Receive("iopub") // welcome
	loop := execute(c, "loop")
	awaitInput(c, loop)
	cmd.Process.Signal(os.Interrupt)
	if r := c.ReplyTo("shell", loop); r.Text("ename") != "Interrupted" {
		t.Errorf("after SIGINT: %v", r.Content)
	}
	cmd.Process.Signal(os.Interrupt) // while nothing runs
	if r := c.Call("shell", "execute_request", map[string]any{"code": "out x"}); r.Content["status"] != "ok" {
		t.Errorf("after a second SIGINT: %v", r.Content)
	}
	awaitInput(c, execute(c, "loop"))
	cmd.Process.Signal(syscall.SIGTERM)
	hangUp(c)
	if code := wait(t, cmd, 2*time.Second); code != 0 {
		t.Errorf("exit code %d after SIGTERM; log:\n%s", code, stderr)
	}
	if files, _ := filepath.Glob(filepath.Join(dir, "k-*")); files != nil {
		t.Errorf("socket files %v are left", files)
	}
}

func TestShutdownExitsWithZero(t *testing.T) {
	path := protocoltest.WriteConnection(t, nil)
	cmd, stderr := child(t, path)
	c := protocoltest.Dial(t, path)
	c.Call("control", "shutdown_request", map[string]any{"restart": false})
	hangUp(c)
	if code := wait(t, cmd, 2*time.Second); code != 0 || stderr.Len() > 0 {
		t.Errorf("exit code %d, log:\n%s", code, stderr)
	}
}

// TestTheKernelEndsWithTheProcessThatStartedIt lets a shell start the kernel and
// end without a word.
func TestTheKernelEndsWithTheProcessThatStartedIt(t *testing.T) {
	for name, start := range map[string]string{
		"directly":              `JPY_PARENT_PID=$$ "$0" & read line`,
		"through another shell": `JPY_PARENT_PID=$$ sh -c '"$0" & wait' "$0" & read line`,
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			outlives(t, start)
		})
	}
}

// outlives fails the test if a kernel that a shell starts outlives the shell.
func outlives(t *testing.T, start string) {
	path := protocoltest.WriteConnection(t, nil)
	program, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	shell := exec.Command("/bin/sh", "-c", start, program)
	shell.Env = append(os.Environ(), fakeKernel+"="+path)
	stdin, err := shell.StdinPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := shell.Start(); err != nil {
		t.Fatal(err)
	}
	c := protocoltest.Dial(t, path)
	pid := int(c.Call("control", "usage_request", struct{}{}).Content["pid"].(float64))
	time.Sleep(2 * parentPause)
	if r, _ := c.Execute("out x"); r.Content["status"] != "ok" {
		t.Errorf("while the parent lives: %v", r.Content)
	}
	stdin.Close()
	shell.Process.Wait()
	for began := time.Now(); running(pid) && time.Since(began) < protocoltest.Patience; {
		time.Sleep(10 * time.Millisecond)
	}
	if running(pid) {
		t.Errorf("the kernel %d outlived its parent", pid)
		syscall.Kill(pid, syscall.SIGKILL)
	}
}

// running reports whether a process has not ended; one that has ended and was
// not collected yet does not count.
func running(pid int) bool {
	if syscall.Kill(pid, 0) != nil {
		return false
	}
	text, err := os.ReadFile("/proc/" + strconv.Itoa(pid) + "/stat")
	return err != nil || !strings.Contains(string(text), ") Z ")
}

func TestAKernelThatCannotStartSaysWhyInOneLine(t *testing.T) {
	first := protocoltest.WriteConnection(t, nil)
	running, _ := child(t, first)
	c := protocoltest.Dial(t, first)
	broken := filepath.Join(t.TempDir(), "broken.json")
	if err := os.WriteFile(broken, []byte("{"), 0o600); err != nil {
		t.Fatal(err)
	}
	for path, want := range map[string]string{
		first:  "is taken by another program",
		broken: "is not a JSON object",
		"none": "connection file none does not exist",
	} {
		cmd, stderr := child(t, path)
		if code := wait(t, cmd, 2*time.Second); code != 1 || strings.Count(stderr.String(), "\n") != 1 || !strings.Contains(stderr.String(), want) {
			t.Errorf("%s: exit code %d and %q; want 1 and a line with %q", path, code, stderr, want)
		}
	}
	hangUp(c)
	running.Process.Signal(syscall.SIGTERM)
	wait(t, running, 2*time.Second)
}
