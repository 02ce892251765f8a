package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"brinkline": main})
}

// The scripts in testdata/script run the command as a user does.
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:                 filepath.Join("testdata", "script"),
		RequireExplicitExec: true,
		RequireUniqueNames:  true,
		Cmds:                map[string]func(*testscript.TestScript, bool, []string){"waitfor": waitFor},
	})
}

// waitFor waits until a file holds a text: "waitfor FILE TEXT". Cells tell by a
// file that they run.
func waitFor(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: waitfor FILE TEXT")
	}
	for range 600 {
		content, err := os.ReadFile(ts.MkAbs(args[0]))
		if err == nil && strings.Contains(string(content), args[1]) {
			return
		}
		time.Sleep(50 * time.Millisecond)
	}
	ts.Fatalf("%s does not hold %q after 30 s", args[0], args[1])
}
