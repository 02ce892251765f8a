package wire

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strconv"
	"strings"
)

// Connection says where a kernel listens and how its messages are signed: the
// content of a connection file.
type Connection struct {
	Transport string // "tcp" or "ipc"
	IP        string // address to bind, or the stem of the socket files for ipc

	// Ports to bind, or suffixes of the socket files for ipc. A zero is
	// replaced by a free one when the sockets are opened.
	Shell, IOPub, Stdin, Control, Heartbeat int

	Key             string // empty: messages are not signed
	SignatureScheme string // "hmac-sha256" and its kin

	path   string                     // file that it was read from
	fields map[string]json.RawMessage // everything in that file
}

// ports pairs the names of the ports in a connection file with their fields.
func (c *Connection) ports() []portField {
	return []portField{
		{"shell_port", &c.Shell},
		{"iopub_port", &c.IOPub},
		{"stdin_port", &c.Stdin},
		{"control_port", &c.Control},
		{"hb_port", &c.Heartbeat},
	}
}

type portField struct {
	name string
	port *int
}

// ReadConnection reads the connection file at path. Each error is one line that
// names the file and what is wrong with it.
func ReadConnection(path string) (*Connection, error) {
	text, err := os.ReadFile(path)
	if err != nil {
		if errors.Is(err, fs.ErrNotExist) {
			return nil, fmt.Errorf("connection file %s does not exist", path)
		}
		return nil, fmt.Errorf("connection file %s cannot be read: %v", path, plain(err))
	}
	c, err := parseConnection(text)
	if err != nil {
		return nil, fmt.Errorf("connection file %s: %w", path, err)
	}
	c.path = path
	return c, nil
}

// plain strips the operation and path that the os package puts before a cause.
func plain(err error) error {
	var pathError *fs.PathError
	if errors.As(err, &pathError) {
		return pathError.Err
	}
	return err
}

func parseConnection(text []byte) (*Connection, error) {
	c := &Connection{Transport: "tcp", IP: "127.0.0.1", SignatureScheme: "hmac-sha256"}
	if len(bytes.TrimSpace(text)) == 0 {
		return nil, errors.New("is empty")
	}
	if err := json.Unmarshal(text, &c.fields); err != nil || c.fields == nil {
		return nil, fmt.Errorf("is not a JSON object%s", because(err))
	}
	if name := c.encryption(); name != "" {
		return nil, fmt.Errorf("asks for encryption (%q), which is not supported; start the kernel without it", name)
	}
	for _, f := range []struct {
		name string
		text *string
	}{{"transport", &c.Transport}, {"ip", &c.IP}, {"key", &c.Key}, {"signature_scheme", &c.SignatureScheme}} {
		if err := c.text(f.name, f.text); err != nil {
			return nil, err
		}
	}
	if c.Transport != "tcp" && c.Transport != "ipc" {
		return nil, fmt.Errorf("transport %q is not supported; use tcp or ipc", c.Transport)
	}
	if _, err := newSigner(c.SignatureScheme, c.Key); err != nil {
		return nil, err
	}
	return c, c.readPorts()
}

func because(err error) string {
	if err == nil {
		return ""
	}
	return ": " + err.Error()
}

// encryption returns the name of a field that holds an encryption key, or "".
func (c *Connection) encryption() string {
	for _, name := range []string{"curve_publickey", "curve_secretkey", "curve_serverkey"} {
		if raw, ok := c.fields[name]; ok && string(raw) != "null" && string(raw) != `""` {
			return name
		}
	}
	return ""
}

// text reads the field called name, if there is one, into s.
func (c *Connection) text(name string, s *string) error {
	raw, ok := c.fields[name]
	if !ok || string(raw) == "null" {
		return nil
	}
	if err := json.Unmarshal(raw, s); err != nil {
		return fmt.Errorf("%s is %s; a string is wanted", name, raw)
	}
	return nil
}

func (c *Connection) readPorts() error {
	limit := 65535
	if c.Transport == "ipc" {
		limit = 1<<31 - 1
	}
	for _, p := range c.ports() {
		raw, ok := c.fields[p.name]
		if !ok {
			return fmt.Errorf("%s is missing", p.name)
		}
		n, err := strconv.Atoi(strings.Trim(string(raw), `"`))
		if err != nil || n < 0 || n > limit {
			return fmt.Errorf("%s is %s; a port from 0 to %d is wanted", p.name, raw, limit)
		}
		*p.port = n
	}
	return nil
}

// writeBack stores ports that were chosen at binding in the file that c came
// from, so that clients find them. Other fields keep their values.
func (c *Connection) writeBack() error {
	if c.path == "" {
		return nil
	}
	for _, p := range c.ports() {
		c.fields[p.name] = json.RawMessage(strconv.Itoa(*p.port))
	}
	text, err := json.MarshalIndent(c.fields, "", "  ")
	if err != nil {
		return err
	}
	if err := replaceFile(c.path, append(text, '\n'), 0o600); err != nil {
		return fmt.Errorf("connection file %s: the chosen ports cannot be written: %v", c.path, plain(err))
	}
	return nil
}

// replaceFile puts text in the place of the file at path in one step.
func replaceFile(path string, text []byte, mode fs.FileMode) error {
	f, err := os.CreateTemp(filepath.Dir(path), ".connection-*")
	if err != nil {
		return err
	}
	defer os.Remove(f.Name()) // fails once renamed
	_, err = f.Write(text)
	if err := errors.Join(err, f.Chmod(mode), f.Close()); err != nil {
		return err
	}
	return os.Rename(f.Name(), path)
}
