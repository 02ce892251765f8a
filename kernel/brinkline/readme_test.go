package main

import (
	"bytes"
	"context"
	"encoding/json"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"brinkline/kernel/headless"
)

const (
	readmeDemo    = "../../notebooks-demo/01-stirred-tank.ipynb"
	readmePicture = "../../notebooks-demo/01-stirred-tank.svg"
)

// README shows what its first command prints. Times, which only long cells have, are
// left out on both sides.
func TestReadmeShowsWhatTheRunPrints(t *testing.T) {
	readme, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	bare := filepath.Join(t.TempDir(), "tank.ipynb")
	text, err := os.ReadFile(readmeDemo)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(bare, withoutOutputs(t, text), 0o644); err != nil {
		t.Fatal(err)
	}
	var out bytes.Buffer
	job := headless.Job{Notebook: bare, Output: bare}
	if err := job.Run(context.Background(), sessions(), &out); err != nil {
		t.Fatal(err)
	}
	took := regexp.MustCompile(`(?m)  \d+\.\d s$`)
	for line := range strings.Lines(took.ReplaceAllString(out.String(), "")) {
		line = strings.TrimRight(line, "\n")
		if !strings.HasPrefix(line, "wrote ") && !bytes.Contains(readme, []byte("    "+line+"\n")) {
			t.Errorf("README lacks the line %q", line)
		}
	}
}

// The picture in README is the first figure of the notebook that its first command
// runs.
func TestReadmePictureIsThatOfTheDemo(t *testing.T) {
	var nb struct {
		Cells []struct {
			Outputs []struct {
				Data map[string]json.RawMessage
			}
		}
	}
	text, err := os.ReadFile(readmeDemo)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, &nb); err != nil {
		t.Fatal(err)
	}
	var lines []string
	for _, c := range nb.Cells {
		for _, o := range c.Outputs {
			if raw := o.Data["image/svg+xml"]; raw != nil && lines == nil {
				if err := json.Unmarshal(raw, &lines); err != nil {
					t.Fatal(err)
				}
			}
		}
	}
	want := []byte(strings.Join(lines, ""))
	if len(want) == 0 {
		t.Fatal("the notebook has no figure")
	}
	if *update {
		if err := os.WriteFile(readmePicture, want, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	got, err := os.ReadFile(readmePicture)
	if err != nil || !bytes.Equal(got, want) {
		t.Errorf("the picture is not that of the notebook (run the test with -update): %v", err)
	}
}
