package main

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/http"
	"os"
	"os/exec"
	"regexp"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"github.com/rogpeppe/go-internal/testscript"
)

// patience bounds every wait of the tests.
const patience = 30 * time.Second

// process is a daemon that runs beside a test, by its real binary.
type process struct {
	cmd    *exec.Cmd
	api    string // http://…
	permit string
	first  string // line of its log
	log    *logText
	copied chan struct{} // closed when its log has ended
	fed    func()
}

// logText gathers a log.
type logText struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (l *logText) add(line string) {
	l.mu.Lock()
	defer l.mu.Unlock()
	l.b.WriteString(line + "\n")
}

func (l *logText) String() string {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.b.String()
}

var bound = regexp.MustCompile(`api=(\S+) permit=(\S+)`)

// launch starts serve and reads from the first line of its log where it
// listens.
func launch(config string, env ...string) (*process, error) {
	p := &process{cmd: exec.Command("beamward", "serve", "--config", config), log: &logText{}, copied: make(chan struct{}), fed: func() {}}
	p.cmd.Env = append(os.Environ(), env...)
	out, err := p.cmd.StderrPipe()
	if err != nil {
		return nil, err
	}
	if err := p.cmd.Start(); err != nil {
		return nil, err
	}
	lines := bufio.NewScanner(out)
	told := make(chan string, 1)
	go func() {
		defer close(p.copied)
		defer close(told)
		for n := 0; lines.Scan(); n++ {
			if n == 0 {
				told <- lines.Text()
			}
			p.log.add(lines.Text())
		}
	}()
	select {
	case p.first = <-told:
	case <-time.After(patience):
	}
	at := bound.FindStringSubmatch(p.first)
	if at == nil {
		_ = p.end(syscall.SIGKILL)
		return nil, fmt.Errorf("the first line of its log names no addresses: %q", p.first)
	}
	p.api, p.permit = "http://"+at[1], "http://"+at[2]
	return p, nil
}

// end signals the daemon and waits for it. After SIGTERM it must end in good
// order.
func (p *process) end(s os.Signal) error {
	p.fed()
	if err := p.cmd.Process.Signal(s); err != nil && !errors.Is(err, os.ErrProcessDone) {
		return err
	}
	ended := make(chan struct{})
	go func() {
		defer close(ended)
		<-p.copied
	}()
	select {
	case <-ended:
	case <-time.After(patience):
		_ = p.cmd.Process.Kill()
		<-ended
	}
	err := p.cmd.Wait()
	if s == syscall.SIGKILL {
		return nil
	}
	return err
}

// feed tells every 250 ms that the beam tracks a fixed direction and that the
// interlock is safe, by plain HTTP.
func (p *process) feed(say func(format string, args ...any)) {
	ctx, cancel := context.WithCancel(context.Background())
	var sends sync.WaitGroup
	sends.Go(func() {
		tick := time.NewTicker(250 * time.Millisecond)
		defer tick.Stop()
		for {
			now := time.Now().UTC().Format("2006-01-02T15:04:05.000Z")
			facts := fmt.Sprintf(`{"kind":"aim","beam":"north","at":%q,"icrs":{"ra_deg":0,"dec_deg":-89.5},"error_arcsec":5,"from":"encoder","motion":"tracking"}
{"kind":"interlock","source":"catwalk","at":%q,"safe":true}
`, now, now)
			r, err := http.NewRequestWithContext(ctx, http.MethodPost, p.api+"/v1/facts", strings.NewReader(facts))
			if err == nil {
				r.Header.Set("Content-Type", "application/x-ndjson")
				var a *http.Response
				if a, err = http.DefaultClient.Do(r); err == nil {
					body, _ := io.ReadAll(a.Body)
					a.Body.Close()
					if !bytes.Contains(body, []byte(`"refused_total":0`)) {
						say("facts: %s", body)
					}
				}
			}
			if err != nil && ctx.Err() == nil {
				say("facts: %v", err)
			}
			select {
			case <-ctx.Done():
				return
			case <-tick.C:
			}
		}
	})
	p.fed = sync.OnceFunc(func() {
		cancel()
		sends.Wait()
		http.DefaultClient.CloseIdleConnections()
	})
}

// get asks for a JSON document.
func get(url string, into any) error {
	a, err := http.Get(url)
	if err != nil {
		return err
	}
	defer a.Body.Close()
	data, err := io.ReadAll(a.Body)
	if err != nil {
		return err
	}
	if a.StatusCode != http.StatusOK {
		return fmt.Errorf("%s: %d %s", url, a.StatusCode, data)
	}
	return json.Unmarshal(data, into)
}

// beamNow is how a beam stands.
type beamNow struct {
	Now struct {
		State   string `json:"state"`
		Reasons []struct {
			Code string `json:"code"`
		} `json:"reasons"`
	} `json:"now"`
}

func (b *beamNow) codes() string {
	var names []string
	for _, r := range b.Now.Reasons {
		names = append(names, r.Code)
	}
	return strings.Join(names, " ")
}

// until waits until the beam is in a state, and where code is given for that
// reason.
func (p *process) until(state, code string) error {
	var b beamNow
	for deadline := time.Now().Add(patience); ; {
		if err := get(p.api+"/v1/beams/north", &b); err != nil {
			return err
		}
		if b.Now.State == state && (code == "" || strings.Contains(b.codes(), code)) {
			return nil
		}
		if time.Now().After(deadline) {
			return fmt.Errorf("the beam is %s (%s), not %s %s; the log:\n%s", b.Now.State, b.codes(), state, code, p.log)
		}
		time.Sleep(20 * time.Millisecond)
	}
}

// running are the daemons of the scripts, by script.
var running sync.Map

func daemonOf(ts *testscript.TestScript) *process {
	p, ok := running.Load(ts)
	if !ok {
		ts.Fatalf("no daemon runs")
	}
	return p.(*process)
}

// daemon DIR [NAME=VALUE]... starts serve on a site, and tells the script where
// it is.
func startDaemon(ts *testscript.TestScript, _ bool, args []string) {
	if len(args) < 1 {
		ts.Fatalf("usage: daemon DIR [NAME=VALUE]...")
	}
	p, err := launch(ts.MkAbs(args[0])+"/beamward.yaml", args[1:]...)
	ts.Check(err)
	running.Store(ts, p)
	ts.Defer(func() {
		if _, still := running.LoadAndDelete(ts); still {
			_ = p.end(syscall.SIGKILL)
		}
	})
	ts.Setenv("BEAMWARD_SERVER", p.api)
	ts.Setenv("PERMIT", p.permit)
}

// stop-daemon [kill] ends the daemon, and writes its log to daemon.log.
func stopDaemon(ts *testscript.TestScript, _ bool, args []string) {
	p := daemonOf(ts)
	running.Delete(ts)
	sig := os.Signal(syscall.SIGTERM)
	if len(args) > 0 && args[0] == "kill" {
		sig = syscall.SIGKILL
	}
	ts.Check(p.end(sig))
	ts.Check(os.WriteFile(ts.MkAbs("daemon.log"), []byte(p.log.String()), 0o600))
}

// feed has facts sent until the daemon ends.
func feedDaemon(ts *testscript.TestScript, _ bool, _ []string) { daemonOf(ts).feed(ts.Logf) }

// await STATE [CODE] waits for the state of beam north.
func awaitBeam(ts *testscript.TestScript, _ bool, args []string) {
	code := ""
	if len(args) > 1 {
		code = args[1]
	}
	ts.Check(daemonOf(ts).until(args[0], code))
}

// The scripts' ways of waiting are sound only if a daemon that cannot start
// says so.
func TestLaunchOfNothing(t *testing.T) {
	if _, err := launch(t.TempDir() + "/none.yaml"); err == nil {
		t.Error("a daemon without a configuration was taken to run")
	}
}
