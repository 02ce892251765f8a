package kernel

import (
	"encoding/json"
	"image/png"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
)

// home gives the test a home of its own, without Jupyter's variables.
func home(t *testing.T) string {
	t.Helper()
	dir := t.TempDir()
	t.Setenv("HOME", dir)
	for _, name := range []string{"JUPYTER_DATA_DIR", "JUPYTER_PATH", "JUPYTER_PLATFORM_DIRS", "XDG_DATA_HOME", "VIRTUAL_ENV", "CONDA_PREFIX"} {
		t.Setenv(name, "")
	}
	return dir
}

// program makes a file that stands for the program to register.
func program(t *testing.T) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "brinkline")
	if err := os.WriteFile(path, nil, 0o755); err != nil {
		t.Fatal(err)
	}
	return path
}

func TestRegisterAndUnregister(t *testing.T) {
	dir, path := home(t), program(t)
	folder, err := Register(Registration{Executable: path, Env: map[string]string{"A": "b"}})
	if err != nil {
		t.Fatal(err)
	}
	if runtime.GOOS == "linux" && folder != filepath.Join(dir, ".local/share/jupyter/kernels/brinkline") {
		t.Errorf("folder %s", folder)
	}
	text, err := os.ReadFile(filepath.Join(folder, "kernel.json"))
	if err != nil {
		t.Fatal(err)
	}
	var got struct {
		Argv             []string
		Display_name     string
		Language         string
		Interrupt_mode   string
		Env              map[string]string
		Metadata         map[string]any
		Protocol_version string `json:"kernel_protocol_version"`
	}
	if err := json.Unmarshal(text, &got); err != nil {
		t.Fatal(err)
	}
	if want := []string{path, "kernel", "{connection_file}"}; strings.Join(got.Argv, " ") != strings.Join(want, " ") {
		t.Errorf("argv %q, want %q", got.Argv, want)
	}
	if got.Display_name != "Brinkline" || got.Language != "go" || got.Interrupt_mode != "message" ||
		got.Protocol_version != "5.5" || got.Env["A"] != "b" || got.Metadata == nil {
		t.Errorf("kernel.json\n%s", text)
	}
	checkPictures(t, folder)
	if _, err := Register(Registration{Executable: path}); err != nil {
		t.Errorf("registering again: %v", err)
	}
	removed, err := Unregister("", Place{})
	if err != nil || removed != folder {
		t.Errorf("removed %q, %v", removed, err)
	}
	if _, err := os.Stat(folder); !os.IsNotExist(err) {
		t.Errorf("%s is left", folder)
	}
}

func checkPictures(t *testing.T, folder string) {
	t.Helper()
	for name, size := range map[string]int{"logo-32x32.png": 32, "logo-64x64.png": 64} {
		f, err := os.Open(filepath.Join(folder, name))
		if err != nil {
			t.Fatal(err)
		}
		defer f.Close()
		if c, err := png.DecodeConfig(f); err != nil || c.Width != size || c.Height != size {
			t.Errorf("%s: %d x %d, %v", name, c.Width, c.Height, err)
		}
	}
	if text, err := os.ReadFile(filepath.Join(folder, "logo-svg.svg")); err != nil || !strings.HasPrefix(string(text), "<svg ") {
		t.Errorf("logo-svg.svg: %.20s, %v", text, err)
	}
}

func TestPlaces(t *testing.T) {
	dir, path := home(t), program(t)
	for _, x := range []struct {
		variable string
		place    Place
		want     string
	}{
		{"JUPYTER_DATA_DIR", Place{}, "data/kernels/brinkline"},
		{"XDG_DATA_HOME", Place{}, "data/jupyter/kernels/brinkline"},
		{"JUPYTER_DATA_DIR", Place{Prefix: filepath.Join(dir, "env")}, "env/share/jupyter/kernels/brinkline"},
	} {
		if x.variable == "XDG_DATA_HOME" && runtime.GOOS != "linux" {
			continue
		}
		t.Run(x.want, func(t *testing.T) {
			t.Setenv(x.variable, filepath.Join(dir, "data"))
			folder, err := Register(Registration{Executable: path, Place: x.place})
			if want := filepath.Join(dir, x.want); err != nil || folder != want {
				t.Errorf("folder %s, %v; want %s", folder, err, want)
			}
			if _, err := Unregister("brinkline", x.place); err != nil {
				t.Error(err)
			}
		})
	}
	if system, err := (Place{System: true}).dataFolder(); err != nil || runtime.GOOS != "windows" && system != "/usr/local/share/jupyter" {
		t.Errorf("system place %s, %v", system, err)
	}
}

// TestRegistrationMistakes asks for one line each that says what to do.
func TestRegistrationMistakes(t *testing.T) {
	dir, path := home(t), program(t)
	file := filepath.Join(dir, "file")
	if err := os.WriteFile(file, nil, 0o644); err != nil {
		t.Fatal(err)
	}
	elsewhere := filepath.Join(dir, "elsewhere")
	if err := os.Mkdir(elsewhere, 0o755); err != nil {
		t.Fatal(err)
	}
	temporary := filepath.Join(dir, "go-build123", "b001", "exe", "brinkline")
	for _, x := range []struct {
		r    Registration
		want string
	}{
		{Registration{Executable: filepath.Join(dir, "none")}, "none is not a program"},
		{Registration{Executable: dir}, "is not a program"},
		{Registration{Executable: temporary}, "build it first"},
		{Registration{Executable: path, Name: "a b"}, `"a b" is no name for a kernel; use letters`},
		{Registration{Executable: path, Name: ".."}, `".." is no name for a kernel`},
		{Registration{Executable: path, Place: Place{Prefix: file}}, "not a directory"},
		{Registration{Executable: path, Place: Place{Prefix: dir, System: true}}, "not to both"},
	} {
		_, err := Register(x.r)
		if err == nil || !strings.Contains(err.Error(), x.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%+v:\n got %v\nwant %s", x.r, err, x.want)
		}
	}
	if _, err := Unregister("", Place{}); err == nil || !strings.HasPrefix(err.Error(), "no kernel is registered in ") {
		t.Errorf("nothing to remove: %v", err)
	}
	t.Setenv("JUPYTER_PATH", filepath.Join(elsewhere, "share", "jupyter"))
	there, err := Register(Registration{Executable: path, Place: Place{Prefix: elsewhere}})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := Unregister("", Place{}); err == nil || !strings.Contains(err.Error(), "there is one in "+there) {
		t.Errorf("one elsewhere: %v", err)
	}
}

func TestAPlaceThatCannotBeWritten(t *testing.T) {
	if os.Getuid() == 0 {
		dir := t.TempDir()
		t.Setenv("JUPYTER_DATA_DIR", filepath.Join(dir, "file", "below"))
		if err := os.WriteFile(filepath.Join(dir, "file"), nil, 0o600); err != nil {
			t.Fatal(err)
		}
	} else {
		t.Setenv("JUPYTER_DATA_DIR", "/usr/share/none")
	}
	_, err := Register(Registration{Executable: program(t)})
	if err == nil || !strings.HasPrefix(err.Error(), "cannot register the kernel: ") || strings.Contains(err.Error(), "\n") {
		t.Errorf("got %v", err)
	}
}
