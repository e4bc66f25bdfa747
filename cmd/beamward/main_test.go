package main

import (
	"bytes"
	"context"
	"errors"
	"flag"
	"fmt"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
	"go.uber.org/goleak"
)

var update = flag.Bool("update", false, "write the scripts' golden outputs anew")

// TestMain lets the scripts run this test binary as beamward.
func TestMain(m *testing.M) {
	testscript.Main(leakless{m}, map[string]func(){"beamward": func() {
		ctx, stop := signal.NotifyContext(context.Background(), syscall.SIGINT, syscall.SIGTERM)
		context.AfterFunc(ctx, stop)
		os.Exit(run(ctx, os.Args[1:], os.Stdin, os.Stdout, os.Stderr))
	}})
}

// leakless fails where a goroutine outlives the tests.
type leakless struct{ m *testing.M }

func (l leakless) Run() int {
	code := l.m.Run()
	if err := goleak.Find(); code == 0 && err != nil {
		fmt.Fprintln(os.Stderr, err)
		return 1
	}
	return code
}

// The scripts run every command as a shell would, with its documented errors.
func TestScripts(t *testing.T) {
	root, err := filepath.Abs("../../testdata")
	if err != nil {
		t.Fatal(err)
	}
	testscript.Run(t, testscript.Params{
		Dir: "testdata/script", UpdateScripts: *update, RequireExplicitExec: true, RequireUniqueNames: true,
		Setup: func(e *testscript.Env) error {
			e.Setenv("TESTDATA", root)
			e.Setenv("HOME", e.WorkDir)
			return nil
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"exits": exits, "daemon": startDaemon, "stop-daemon": stopDaemon, "feed": feedDaemon, "await": awaitBeam, "site": copySite,
			"dated": datedFiles, "spoil": spoilFile,
		},
	})
}

// exits STATUS COMMAND... runs a command that must end with the status.
func exits(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: exits STATUS COMMAND...")
	}
	want, err := strconv.Atoi(args[0])
	ts.Check(err)
	err = ts.Exec(args[1], args[2:]...)
	got := 0
	if e := (*exec.ExitError)(nil); errors.As(err, &e) {
		got = e.ExitCode()
	} else {
		ts.Check(err)
	}
	if got != want {
		ts.Fatalf("%s ended with %d, not %d", strings.Join(args[1:], " "), got, want)
	}
}

// site NAME [OLD NEW]... makes a folder with the example site, on ports of its
// own, with each OLD replaced by NEW, in which \n is a line's end.
func copySite(ts *testscript.TestScript, _ bool, args []string) {
	if len(args)%2 != 1 {
		ts.Fatalf("usage: site NAME [OLD NEW]...")
	}
	text := siteCopy(ts.ReadFile(filepath.Join(ts.Getenv("TESTDATA"), "site", "beamward.yaml")))
	for i := 1; i < len(args); i += 2 {
		if !strings.Contains(text, args[i]) {
			ts.Fatalf("the example site has no %q", args[i])
		}
		text = strings.ReplaceAll(text, args[i], strings.ReplaceAll(args[i+1], `\n`, "\n"))
	}
	dir := ts.MkAbs(args[0])
	ts.Check(os.MkdirAll(filepath.Join(dir, "lists"), 0o700))
	ts.Check(os.WriteFile(filepath.Join(dir, "beamward.yaml"), []byte(text), 0o600))
}

// siteCopy is the example site's text with ports that the system chooses.
func siteCopy(text string) string {
	return strings.NewReplacer("127.0.0.1:8460", "127.0.0.1:0", "127.0.0.1:8461", "127.0.0.1:0").Replace(text)
}

// dated FILE... puts instants about now in the place of @FROM@, @UNTIL@ and
// @ISSUED@.
func datedFiles(ts *testscript.TestScript, _ bool, args []string) {
	now := time.Now().UTC().Truncate(time.Hour)
	stamp := func(d time.Duration) string { return now.Add(d).Format("2006-01-02T15:04:05Z") }
	put := strings.NewReplacer("@FROM@", stamp(-24*time.Hour), "@UNTIL@", stamp(24*time.Hour), "@ISSUED@", stamp(-30*time.Hour))
	for _, name := range args {
		ts.Check(os.WriteFile(ts.MkAbs(name), []byte(put.Replace(ts.ReadFile(name))), 0o600))
	}
}

// spoil FILE changes one byte within each compressed block of a record. A page
// that the store no longer uses may hold an old block: one change alone could
// hit that.
func spoilFile(ts *testscript.TestScript, _ bool, args []string) {
	path := ts.MkAbs(args[0])
	data, err := os.ReadFile(path)
	ts.Check(err)
	magic := []byte{0x28, 0xb5, 0x2f, 0xfd} // Zstandard's magic number, RFC 8878
	spoilt := 0
	for at := bytes.Index(data, magic); at >= 0 && at+24 < len(data); spoilt++ {
		data[at+24] ^= 1
		next := bytes.Index(data[at+24:], magic)
		if next < 0 {
			break
		}
		at += 24 + next
	}
	if spoilt == 0 {
		ts.Fatalf("%s holds no block", path)
	}
	ts.Check(os.WriteFile(path, data, 0o600))
}
