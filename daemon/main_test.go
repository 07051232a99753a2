package main

import (
	"bufio"
	"context"
	"encoding/json"
	"io"
	"net/http"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"nightbench/instruments/practice"

	"github.com/rogpeppe/go-internal/testscript"
)

// beCommand makes the test binary act as the nightbench command, so that tests
// run the real thing in a process of its own and may kill it.
const beCommand = "NIGHTBENCH_BE_COMMAND"

func TestMain(m *testing.M) {
	if os.Getenv(beCommand) == "1" {
		os.Exit(run(os.Args[1:]))
	}
	testscript.Main(m, map[string]func(){"nightbench": func() { os.Exit(run(os.Args[1:])) }})
}

func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{Dir: "testdata/script", Setup: func(e *testscript.Env) error {
		bad, err := filepath.Abs("../testdata/bad")
		e.Setenv("BAD", bad)
		e.Setenv("XDG_STATE_HOME", filepath.Join(e.WorkDir, "xdg"))
		return err
	}})
}

// process is a nightbench in a process of its own, and what it has printed.
type process struct {
	t    *testing.T
	cmd  *exec.Cmd
	done chan struct{} // closed when it has ended and all its output is read

	mu    sync.Mutex
	lines []string
	more  chan struct{} // closed and renewed when a line came
}

// start runs nightbench with its output collected. It is killed when the test ends.
func start(t *testing.T, args ...string) *process {
	t.Helper()
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	p := &process{t: t, cmd: exec.Command(self, args...), done: make(chan struct{}), more: make(chan struct{})}
	p.cmd.Env = append(os.Environ(), beCommand+"=1")
	out, err := p.cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	p.cmd.Stderr = p.cmd.Stdout
	if err := p.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	go p.collect(out)
	t.Cleanup(func() {
		p.cmd.Process.Kill() // it may have ended already
		<-p.done
		if t.Failed() {
			t.Logf("nightbench %s printed:\n%s", strings.Join(args, " "), p.text())
		}
	})
	return p
}

func (p *process) collect(out io.Reader) {
	defer close(p.done)
	for s := bufio.NewScanner(out); s.Scan(); {
		p.mu.Lock()
		p.lines = append(p.lines, s.Text())
		close(p.more)
		p.more = make(chan struct{})
		p.mu.Unlock()
	}
	p.cmd.Wait() // the exit status is looked at in ProcessState
}

func (p *process) text() string {
	p.mu.Lock()
	defer p.mu.Unlock()
	return strings.Join(p.lines, "\n")
}

// until waits for a line that contains text and returns it.
func (p *process) until(text string) string {
	p.t.Helper()
	deadline := time.After(60 * time.Second)
	for n := 0; ; {
		p.mu.Lock()
		lines, more := p.lines[n:], p.more
		p.mu.Unlock()
		for _, l := range lines {
			n++
			if strings.Contains(l, text) {
				return l
			}
		}
		select {
		case <-more:
		case <-p.done:
			p.t.Fatalf("nightbench ended without printing %q:\n%s", text, p.text())
		case <-deadline:
			p.t.Fatalf("nightbench did not print %q in time:\n%s", text, p.text())
		}
	}
}

// end waits for the process and returns its exit status.
func (p *process) end() int {
	p.t.Helper()
	select {
	case <-p.done:
	case <-time.After(3 * time.Minute):
		p.t.Fatalf("nightbench did not end:\n%s", p.text())
	}
	return p.cmd.ProcessState.ExitCode()
}

func (p *process) signal(s syscall.Signal) { p.cmd.Process.Signal(s) }

// once runs nightbench to its end: output and exit status.
func once(t *testing.T, args ...string) (string, int) {
	t.Helper()
	p := start(t, args...)
	status := p.end()
	return p.text(), status
}

// api asks a daemon through the socket of its state folder.
func api(t *testing.T, state, method, path string, in, out any) {
	t.Helper()
	ctx, cancel := context.WithTimeout(t.Context(), 60*time.Second)
	defer cancel()
	if err := newClient(state).do(ctx, method, path, in, out); err != nil {
		t.Fatalf("%s %s: %v", method, path, err)
	}
}

func get[T any](t *testing.T, state, path string) (v T) {
	t.Helper()
	api(t, state, http.MethodGet, path, nil, &v)
	return v
}

// supplyLog is the practice supply's own log.
func supplyLog(t *testing.T, state string) (lines []practice.LogLine) {
	t.Helper()
	f, err := os.Open(filepath.Join(state, "practice-supply.log"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	for s := bufio.NewScanner(f); s.Scan(); {
		var l practice.LogLine
		if err := json.Unmarshal(s.Bytes(), &l); err != nil {
			t.Fatalf("supply's log: %q: %v", s.Text(), err)
		}
		lines = append(lines, l)
	}
	return lines
}

// eventually waits until something holds.
func eventually(t *testing.T, what string, holds func() bool) {
	t.Helper()
	for deadline := time.Now().Add(60 * time.Second); time.Now().Before(deadline); time.Sleep(50 * time.Millisecond) {
		if holds() {
			return
		}
	}
	t.Fatalf("never came: %s", what)
}
