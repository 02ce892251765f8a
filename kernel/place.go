package kernel

import (
	"fmt"
	"os"
	"path/filepath"
	"runtime"
)

// Place is one of the places in which notebook clients look for kernels. The
// zero value is the user's own.
type Place struct {
	Prefix string // below PREFIX/share/jupyter: an environment, or an installation
	System bool   // for all users of the machine
}

// dataFolder returns the data folder of a place, below which kernels/ is.
func (p Place) dataFolder() (string, error) {
	switch {
	case p.Prefix != "" && p.System:
		return "", fmt.Errorf("a kernel goes below the prefix %s or to the system's place, not to both", p.Prefix)
	case p.Prefix != "":
		prefix, err := filepath.Abs(p.Prefix)
		return filepath.Join(prefix, "share", "jupyter"), err
	case p.System:
		return systemFolders()[0], nil
	}
	return userFolder()
}

// userFolder returns the user's data folder as Jupyter finds it.
func userFolder() (string, error) {
	if dir := os.Getenv("JUPYTER_DATA_DIR"); dir != "" {
		return filepath.Abs(dir)
	}
	home, err := os.UserHomeDir()
	if err != nil {
		return "", fmt.Errorf("cannot find the user's folder (%v); set JUPYTER_DATA_DIR or give a prefix", err)
	}
	switch runtime.GOOS {
	case "darwin":
		if on(os.Getenv("JUPYTER_PLATFORM_DIRS")) {
			return filepath.Join(home, "Library", "Application Support", "Jupyter"), nil
		}
		return filepath.Join(home, "Library", "Jupyter"), nil
	case "windows":
		if dir := os.Getenv("APPDATA"); dir != "" {
			return filepath.Join(dir, "jupyter"), nil
		}
		return filepath.Join(home, ".jupyter", "data"), nil
	}
	if dir := os.Getenv("XDG_DATA_HOME"); dir != "" {
		return filepath.Join(dir, "jupyter"), nil
	}
	return filepath.Join(home, ".local", "share", "jupyter"), nil
}

// on reports whether a variable of Jupyter's is switched on.
func on(value string) bool {
	switch value {
	case "", "0", "no", "n", "false", "off":
		return false
	}
	return true
}

func systemFolders() []string {
	if runtime.GOOS == "windows" {
		return []string{filepath.Join(os.Getenv("PROGRAMDATA"), "jupyter")}
	}
	return []string{"/usr/local/share/jupyter", "/usr/share/jupyter"}
}

// searchPath returns the data folders in which Jupyter looks for kernels, as
// far as they are known outside of Python.
func searchPath() (dirs []string) {
	dirs = filepath.SplitList(os.Getenv("JUPYTER_PATH"))
	if user, err := userFolder(); err == nil {
		dirs = append(dirs, user)
	}
	for _, variable := range []string{"VIRTUAL_ENV", "CONDA_PREFIX"} {
		if prefix := os.Getenv(variable); prefix != "" {
			dirs = append(dirs, filepath.Join(prefix, "share", "jupyter"))
		}
	}
	return append(dirs, systemFolders()...)
}
