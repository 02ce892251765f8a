package kernel

import (
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strings"

	"brinkline/kernel/internal/logo"
	"brinkline/kernel/wire"
)

// Registration says how notebook clients will find the kernel.
type Registration struct {
	Name        string            // of the kernel spec; default "brinkline"
	DisplayName string            // what users choose; default "Brinkline"
	Executable  string            // program that has the command "kernel"; default this one
	Env         map[string]string // set for the kernel beside the client's environment
	Place       Place
}

// spec is the content of kernel.json.
type spec struct {
	Argv            []string          `json:"argv"`
	DisplayName     string            `json:"display_name"`
	Language        string            `json:"language"`
	InterruptMode   string            `json:"interrupt_mode"`
	Env             map[string]string `json:"env"`
	Metadata        map[string]any    `json:"metadata"`
	ProtocolVersion string            `json:"kernel_protocol_version"`
}

const (
	specFile     = "kernel.json"
	defaultName  = "brinkline"
	defaultTitle = "Brinkline"
)

// Register writes the kernel spec and returns its folder. An earlier one of the
// same name is replaced.
func Register(r Registration) (folder string, err error) {
	if r.DisplayName == "" {
		r.DisplayName = defaultTitle
	}
	if folder, err = specFolder(r.Name, r.Place); err != nil {
		return "", err
	}
	program, err := executable(r.Executable)
	if err != nil {
		return "", err
	}
	if r.Env == nil {
		r.Env = map[string]string{}
	}
	text, err := json.MarshalIndent(spec{
		Argv:            []string{program, "kernel", "{connection_file}"},
		DisplayName:     r.DisplayName,
		Language:        "go",
		InterruptMode:   "message",
		Env:             r.Env,
		Metadata:        map[string]any{"debugger": false},
		ProtocolVersion: wire.ProtocolVersion,
	}, "", "  ")
	if err != nil {
		return "", err
	}
	if err := writeSpec(folder, append(text, '\n')); err != nil {
		return "", cannot("register", folder, err)
	}
	return folder, nil
}

// writeSpec fills the folder, kernel.json last: clients look for that.
func writeSpec(folder string, text []byte) error {
	if err := os.MkdirAll(folder, 0o755); err != nil {
		return err
	}
	pictures, err := fs.ReadDir(logo.Files, ".")
	if err != nil {
		return err
	}
	for _, p := range pictures {
		picture, err := logo.Files.ReadFile(p.Name())
		if err == nil {
			err = os.WriteFile(filepath.Join(folder, p.Name()), picture, 0o644)
		}
		if err != nil {
			return err
		}
	}
	temporary := filepath.Join(folder, specFile+".new")
	if err := os.WriteFile(temporary, text, 0o644); err != nil {
		return err
	}
	return os.Rename(temporary, filepath.Join(folder, specFile))
}

// Unregister removes the kernel spec of a name from a place and returns the
// folder that it was in. An empty name stands for "brinkline".
func Unregister(name string, p Place) (folder string, err error) {
	if folder, err = specFolder(name, p); err != nil {
		return "", err
	}
	if _, err := os.Stat(filepath.Join(folder, specFile)); errors.Is(err, fs.ErrNotExist) {
		return "", fmt.Errorf("no kernel is registered in %s%s", folder, elsewhere(filepath.Base(folder)))
	}
	if err := os.RemoveAll(folder); err != nil {
		return "", cannot("unregister", folder, err)
	}
	return folder, nil
}

// elsewhere tells where else a kernel of this name is.
func elsewhere(name string) string {
	var found []string
	for _, dir := range searchPath() {
		folder := filepath.Join(dir, "kernels", name)
		if _, err := os.Stat(filepath.Join(folder, specFile)); err == nil {
			found = append(found, folder)
		}
	}
	if found == nil {
		return ""
	}
	return "; there is one in " + strings.Join(slices.Compact(found), " and in ")
}

// cannot says in one line what failed, where, and what to do about it.
func cannot(do, folder string, err error) error {
	var at *fs.PathError
	hint := ""
	if errors.As(err, &at) {
		err = at.Err
		folder = at.Path
	}
	if errors.Is(err, fs.ErrPermission) {
		hint = "; choose another place"
	}
	return fmt.Errorf("cannot %s the kernel: %s: %v%s", do, folder, err, hint)
}

// validName is what clients accept.
var validName = regexp.MustCompile(`^[A-Za-z0-9._-]+$`)

// specFolder returns the folder of a kernel spec.
func specFolder(name string, p Place) (string, error) {
	if name == "" {
		name = defaultName
	}
	if !validName.MatchString(name) || strings.Trim(name, ".") == "" {
		return "", fmt.Errorf("%q is no name for a kernel; use letters, digits, dots, hyphens and underscores", name)
	}
	dir, err := p.dataFolder()
	if err != nil {
		return "", err
	}
	return filepath.Join(dir, "kernels", strings.ToLower(name)), nil
}

// executable returns the absolute path of the program to start, which must
// be there to stay.
func executable(path string) (string, error) {
	if path == "" {
		self, err := os.Executable()
		if err != nil {
			return "", fmt.Errorf("cannot tell where this program is: %v", err)
		}
		path = self
	}
	path, err := filepath.Abs(path)
	if err != nil {
		return "", err
	}
	if strings.Contains(filepath.ToSlash(path), "/go-build") {
		return "", errors.New("this program is a temporary build of go run, which will be gone; " +
			"build it first (go build -o brinkline ./kernel/brinkline) and register that (./brinkline register)")
	}
	if info, err := os.Stat(path); err != nil || info.IsDir() {
		return "", fmt.Errorf("%s is not a program", path)
	}
	return path, nil
}
