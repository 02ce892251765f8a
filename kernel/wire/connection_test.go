package wire

import (
	"encoding/json"
	"net"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"brinkline/kernel/internal/protocoltest"
)

const ports = `"shell_port": 1, "iopub_port": 2, "stdin_port": 3, "control_port": 4, "hb_port": 5`

func file(t *testing.T, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "c.json")
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

func TestConnectionFile(t *testing.T) {
	c, err := ReadConnection(file(t, `{"transport": "ipc", "ip": "/a/b", "key": "k", "signature_scheme": "hmac-sha512",
		"kernel_name": "x", "shell_port": "70001", "iopub_port": 2, "stdin_port": 3, "control_port": "4", "hb_port": 5}`))
	if err != nil {
		t.Fatal(err)
	}
	got := [...]any{c.Transport, c.IP, c.Key, c.SignatureScheme, c.Shell, c.IOPub, c.Stdin, c.Control, c.Heartbeat}
	if want := [...]any{"ipc", "/a/b", "k", "hmac-sha512", 70001, 2, 3, 4, 5}; got != want {
		t.Errorf("got %v, want %v", got, want)
	}
}

// TestBrokenConnectionFiles asks of each error that it is one line with the
// name of the file and what is wrong.
func TestBrokenConnectionFiles(t *testing.T) {
	for _, x := range []struct{ text, want string }{
		{"", "is empty"},
		{"{", "is not a JSON object: unexpected end"},
		{"[1]", "is not a JSON object"},
		{"null", "is not a JSON object"},
		{`{}`, "shell_port is missing"},
		{strings.Replace(`{`+ports+`}`, "3", `"x"`, 1), `stdin_port is "x"; a port from 0 to 65535 is wanted`},
		{strings.Replace(`{`+ports+`}`, "3", `-1`, 1), "stdin_port is -1"},
		{strings.Replace(`{`+ports+`}`, "3", `65536`, 1), "stdin_port is 65536"},
		{strings.Replace(`{`+ports+`}`, "3", `1.5`, 1), "stdin_port is 1.5"},
		{`{"key": 5, ` + ports + `}`, "key is 5; a string is wanted"},
		{`{"transport": "pgm", ` + ports + `}`, `transport "pgm" is not supported; use tcp or ipc`},
		{`{"signature_scheme": "hmac-crc", ` + ports + `}`, `signature_scheme "hmac-crc" is not supported; use hmac-sha256`},
		{`{"signature_scheme": "sha256", ` + ports + `}`, `signature_scheme "sha256" is not supported`},
		{`{"curve_publickey": "abc", ` + ports + `}`, `asks for encryption ("curve_publickey"), which is not supported`},
	} {
		path := file(t, x.text)
		_, err := ReadConnection(path)
		if err == nil || !strings.Contains(err.Error(), path) || !strings.Contains(err.Error(), x.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s:\n got %v\nwant %s", x.text, err, x.want)
		}
	}
	if _, err := ReadConnection(filepath.Join(t.TempDir(), "none.json")); err == nil || !strings.Contains(err.Error(), "does not exist") {
		t.Errorf("missing file: %v", err)
	}
	if _, err := ReadConnection(t.TempDir()); err == nil || !strings.Contains(err.Error(), "cannot be read: is a directory") {
		t.Errorf("directory: %v", err)
	}
}

func TestChosenPortsAreWrittenBack(t *testing.T) {
	h := start(t, map[string]any{"kernel_name": "kept"}, usual)
	text, err := os.ReadFile(h.path)
	if err != nil {
		t.Fatal(err)
	}
	var fields map[string]any
	if err := json.Unmarshal(text, &fields); err != nil {
		t.Fatal(err)
	}
	c := h.Connection()
	seen := make(map[any]bool)
	for name, port := range map[string]int{
		"shell_port": c.Shell, "iopub_port": c.IOPub, "stdin_port": c.Stdin, "control_port": c.Control, "hb_port": c.Heartbeat,
	} {
		if port == 0 || fields[name] != float64(port) || seen[port] {
			t.Errorf("%s is %v in the file, %d bound", name, fields[name], port)
		}
		seen[port] = true
	}
	if fields["kernel_name"] != "kept" || fields["key"] != protocoltest.Key {
		t.Errorf("other fields changed: %v", fields)
	}
	if info, _ := os.Stat(h.path); info.Mode().Perm() != 0o600 {
		t.Errorf("the file with the key has the mode %v", info.Mode())
	}
}

func TestATakenPortIsOneClearLineAndReleasesTheOthers(t *testing.T) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	c := &Connection{Transport: "tcp", IP: "127.0.0.1", SignatureScheme: "hmac-sha256", Control: l.Addr().(*net.TCPAddr).Port}
	_, err = Open(c, Config{})
	if err == nil || !strings.Contains(err.Error(), "the control socket cannot use port") || !strings.Contains(err.Error(), "taken by another program") || strings.Contains(err.Error(), "\n") {
		t.Errorf("got %v", err)
	}
	free, err := net.Listen("tcp", net.JoinHostPort("127.0.0.1", strconv.Itoa(c.Shell)))
	if err != nil {
		t.Errorf("the shell port is still held: %v", err)
	} else {
		free.Close()
	}
}

func TestAnAddressThatIsNotOurs(t *testing.T) {
	c := &Connection{Transport: "tcp", IP: "192.0.2.1", SignatureScheme: "hmac-sha256"} // reserved for documentation, RFC 5737
	if _, err := Open(c, Config{}); err == nil || !strings.Contains(err.Error(), "the shell socket cannot use port 0 of 192.0.2.1") {
		t.Errorf("got %v", err)
	}
}
