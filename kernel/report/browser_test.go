package report

import (
	"bytes"
	"image/png"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
)

// browser skips a test, or fails it where everything must be there, when there
// is no Chromium; otherwise it opens a page with it and returns what it says.
func browser(t *testing.T, page string, flags ...string) (complaints string) {
	t.Helper()
	program, err := exec.LookPath("chromium")
	if err != nil {
		if os.Getenv("BRINKLINE_REQUIRE_ALL") == "1" {
			t.Fatal(err)
		}
		t.Skip("no chromium to open the page with")
	}
	common := []string{
		"--headless", "--no-sandbox", "--disable-gpu", "--disable-background-networking", "--no-first-run", "--disable-sync",
		"--user-data-dir=" + t.TempDir(), "--enable-logging=stderr", "--hide-scrollbars", "--window-size=1000,1400",
	}
	var said bytes.Buffer
	command := exec.Command(program, append(append(common, flags...), "file://"+page)...)
	command.Stderr = &said
	if err := command.Run(); err != nil {
		t.Fatalf("%v\n%s", err, said.String())
	}
	for line := range strings.Lines(said.String()) {
		if strings.Contains(line, "CONSOLE") {
			complaints += line
		}
	}
	return complaints
}

func savedPage(t *testing.T) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "page.html")
	if err := os.WriteFile(path, []byte(pageOf(t, sample)), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

// The colours of the paper in style.css, light and dark.
func TestBrowserShowsThePageLightAndDarkWithoutComplaint(t *testing.T) {
	t.Parallel()
	page := savedPage(t)
	for _, c := range []struct {
		scheme, setting string
		paper           [3]uint32
	}{
		{"light", "--blink-settings=preferredColorScheme=1", [3]uint32{0xff, 0xff, 0xff}},
		{"dark", "--blink-settings=preferredColorScheme=0", [3]uint32{0x14, 0x18, 0x1c}},
	} {
		picture := filepath.Join(t.TempDir(), "page.png")
		if complaints := browser(t, page, c.setting, "--screenshot="+picture); complaints != "" {
			t.Errorf("%s: the browser complains:\n%s", c.scheme, complaints)
		}
		file, err := os.Open(picture)
		if err != nil {
			t.Fatal(err)
		}
		defer file.Close()
		image, err := png.Decode(file)
		if err != nil {
			t.Fatal(err)
		}
		r, g, b, _ := image.At(2, 2).RGBA()
		if got := [3]uint32{r >> 8, g >> 8, b >> 8}; got != c.paper {
			t.Errorf("%s: the paper is %x, want %x", c.scheme, got, c.paper)
		}
	}
}

// A script that got into the page must not run.
func TestBrowserRefusesScripts(t *testing.T) {
	t.Parallel()
	content := strings.Replace(pageOf(t, sample), "</main>", "<script>document.title = 'ran'</script></main>", 1)
	path := filepath.Join(t.TempDir(), "page.html")
	if err := os.WriteFile(path, []byte(content), 0o600); err != nil {
		t.Fatal(err)
	}
	if complaints := browser(t, path, "--dump-dom"); !strings.Contains(complaints, "Content Security Policy") {
		t.Errorf("the content policy did not stop a script: %q", complaints)
	}
}

func TestBrowserPrintsThePage(t *testing.T) {
	t.Parallel()
	target := filepath.Join(t.TempDir(), "page.pdf")
	browser(t, savedPage(t), "--no-pdf-header-footer", "--print-to-pdf="+target)
	content, err := os.ReadFile(target)
	if err != nil || !bytes.HasPrefix(content, []byte("%PDF")) {
		t.Fatalf("no PDF: %v", err)
	}
	if pages := bytes.Count(content, []byte("/Type /Page\n")) + bytes.Count(content, []byte("/Type/Page/")); pages < 1 || pages > 6 {
		t.Errorf("%d pages", pages)
	}
}
