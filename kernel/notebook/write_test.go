package notebook

import (
	"os"
	"path/filepath"
	"testing"
	"time"
)

func write(t *testing.T, nb *Notebook, path string, want bool) {
	t.Helper()
	written, err := nb.Write(path)
	if err != nil {
		t.Fatal(err)
	}
	if written != want {
		t.Errorf("%s written: %v, want %v", filepath.Base(path), written, want)
	}
}

// A file in a form that is not ours, with nothing changed in it, must stay the
// file it was: same bytes, same inode, same time.
func TestUnchangedNotebookIsNotTouched(t *testing.T) {
	path := filepath.Join(t.TempDir(), "a.ipynb")
	content := "{\"nbformat\":4,\r\n    \"cells\":[]}"
	if err := os.WriteFile(path, []byte(content), 0o600); err != nil {
		t.Fatal(err)
	}
	past := time.Unix(1e9, 0)
	if err := os.Chtimes(path, past, past); err != nil {
		t.Fatal(err)
	}
	write(t, mustRead(t, path), path, false)
	info, err := os.Stat(path)
	if err != nil || !info.ModTime().Equal(past) {
		t.Errorf("the file was touched: %v, %v", info.ModTime(), err)
	}
	copied := filepath.Join(t.TempDir(), "b.ipynb")
	write(t, mustRead(t, path), copied, true)
	if got, _ := os.ReadFile(copied); string(got) != content {
		t.Errorf("copied as %q", got)
	}
}

func TestWriteKeepsModeAndLink(t *testing.T) {
	folder := t.TempDir()
	path, link := filepath.Join(folder, "a.ipynb"), filepath.Join(folder, "link.ipynb")
	if err := os.WriteFile(path, []byte(smallest), 0o640); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("a.ipynb", link); err != nil {
		t.Fatal(err)
	}
	nb := mustRead(t, link)
	nb.SetLanguage(map[string]any{"name": "go"})
	write(t, nb, link, true)
	if info, err := os.Lstat(link); err != nil || info.Mode()&os.ModeSymlink == 0 {
		t.Errorf("the link was replaced: %v, %v", info.Mode(), err)
	}
	if info, err := os.Stat(path); err != nil || info.Mode().Perm() != 0o640 {
		t.Errorf("mode %v, %v", info.Mode(), err)
	}
	if got, _ := os.ReadFile(path); string(got) != string(nb.encode()) {
		t.Errorf("written: %s", got)
	}
	if entries, _ := os.ReadDir(folder); len(entries) != 2 {
		t.Errorf("something was left behind: %v", entries)
	}
}

func TestOutputsThatCannotBeWritten(t *testing.T) {
	folder := t.TempDir()
	locked := filepath.Join(folder, "locked.ipynb")
	if err := os.WriteFile(locked, []byte(smallest), 0o400); err != nil {
		t.Fatal(err)
	}
	nowhere := filepath.Join(folder, "nowhere", "a.ipynb")
	under := filepath.Join(locked, "a.ipynb")
	for _, c := range []struct{ path, want string }{
		{folder, folder + " can't be written: it is a folder; name a file in it"},
		{nowhere, nowhere + " can't be written: there is no folder " + filepath.Dir(nowhere)},
		{locked, locked + " can't be written: the file is read-only"},
		{under, under + " can't be written: not a directory"},
	} {
		if err := CheckWritable(c.path); err == nil || err.Error() != c.want {
			t.Errorf("checked: %v\nwant %s", err, c.want)
		}
		if _, err := WriteFile(c.path, []byte("x")); err == nil || err.Error() != c.want {
			t.Errorf("written: %v\nwant %s", err, c.want)
		}
	}
	if got, _ := os.ReadFile(locked); string(got) != smallest {
		t.Errorf("the read-only file now holds %q", got)
	}
}

func TestCheckWritableLeavesNothing(t *testing.T) {
	folder := t.TempDir()
	if err := CheckWritable(filepath.Join(folder, "new.ipynb")); err != nil {
		t.Fatal(err)
	}
	if entries, _ := os.ReadDir(folder); len(entries) != 0 {
		t.Errorf("left behind: %v", entries)
	}
}
