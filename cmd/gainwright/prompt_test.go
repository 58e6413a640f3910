package main

import (
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/creack/pty"
)

// terminal is the program at a pseudo-terminal.
type terminal struct {
	t       *testing.T
	command *exec.Cmd
	pty     *os.File
	folder  string

	mutex sync.Mutex
	text  strings.Builder
	read  int // how much of text was looked at
	ended chan struct{}
}

const patience = 30 * time.Second

func startPrompt(t *testing.T, folder string, env ...string) *terminal {
	t.Helper()
	program, err := exec.LookPath("gainwright")
	if err != nil {
		t.Fatal(err)
	}
	return startAtTerminal(t, folder, exec.Command(program), env...)
}

func startAtTerminal(t *testing.T, folder string, c *exec.Cmd, env ...string) *terminal {
	t.Helper()
	c.Dir = folder
	c.Env = append(os.Environ(), append([]string{"TERM=xterm", "XDG_STATE_HOME=" + filepath.Join(folder, "state")}, env...)...)
	f, err := pty.StartWithSize(c, &pty.Winsize{Rows: 40, Cols: 100})
	if err != nil {
		t.Skipf("no pseudo-terminal: %v", err)
	}
	x := &terminal{t: t, command: c, pty: f, folder: folder, ended: make(chan struct{})}
	go x.listen()
	t.Cleanup(func() {
		f.Close()
		if c.ProcessState == nil {
			_ = c.Process.Kill()
			_ = c.Wait()
		}
	})
	return x
}

func (x *terminal) listen() {
	defer close(x.ended)
	buffer := make([]byte, 4096)
	for {
		n, err := x.pty.Read(buffer)
		x.mutex.Lock()
		x.text.Write(buffer[:n])
		x.mutex.Unlock()
		if err != nil {
			return
		}
	}
}

// seen is all that the terminal showed so far.
func (x *terminal) seen() string {
	x.mutex.Lock()
	defer x.mutex.Unlock()
	return x.text.String()
}

func (x *terminal) send(text string) {
	x.t.Helper()
	if _, err := x.pty.WriteString(text); err != nil {
		x.t.Fatal(err)
	}
}

// expect waits for a text after what was looked at before.
func (x *terminal) expect(text string) {
	x.t.Helper()
	if !x.appears(text, patience) {
		x.t.Fatalf("%q did not come; after what was seen before stands\n%q", text, x.seen()[x.read:])
	}
}

// appears waits for a text after what was looked at before.
func (x *terminal) appears(text string, within time.Duration) bool {
	for deadline := time.Now().Add(within); ; time.Sleep(2 * time.Millisecond) {
		if i := strings.Index(x.seen()[x.read:], text); i >= 0 {
			x.read += i + len(text)
			return true
		}
		if time.Now().After(deadline) {
			return false
		}
	}
}

// cancel presses Ctrl-C until the prompt is back: a key pressed while the terminal changes
// from one mode to the other is lost, as it is for a hand on the keyboard.
func (x *terminal) cancel() {
	x.t.Helper()
	for range 10 {
		x.send("\x03")
		if x.appears("» ", patience/10) {
			return
		}
	}
	x.t.Fatalf("the prompt did not come back; after what was seen before stands\n%q", x.seen()[x.read:])
}

// leave ends the session and gives its exit status.
func (x *terminal) leave() int {
	x.t.Helper()
	x.send("leave session\r")
	return x.wait()
}

func (x *terminal) wait() int {
	x.t.Helper()
	done := make(chan error, 1)
	go func() { done <- x.command.Wait() }()
	select {
	case <-done:
	case <-time.After(patience):
		x.t.Fatal("the session did not end")
	}
	return x.command.ProcessState.ExitCode()
}

func TestPromptGreetsRunsAndLeaves(t *testing.T) {
	x := startPrompt(t, t.TempDir())
	x.expect("explain WORD")
	x.expect("» ")
	x.send("a = 1/3\r")
	x.expect("a = 1/3 ≈ 0.33333")
	x.send("a * [[1, 3]]\r")
	x.expect("1/3   1")
	x.send("a / unknown_word\r")
	x.expect("prompt:3:5: unknown_word is not known")
	x.send("a + 1\r")
	x.expect("a + 1 = 4/3")
	if status := x.leave(); status != 0 {
		t.Errorf("exit status %d", status)
	}
}

func TestPromptContinuesOverOpenBracketsAndOperators(t *testing.T) {
	x := startPrompt(t, t.TempDir())
	x.expect("» ")
	x.send("B = [[1, 2],\r")
	x.expect("… ")
	x.send("[3, 4]]\r")
	x.expect("3   4")
	x.send("1 +\r")
	x.expect("… ")
	x.send("2\r")
	x.expect("= 3")
	x.leave()
}

func TestControlCCancelsTheInputOnly(t *testing.T) {
	x := startPrompt(t, t.TempDir())
	x.expect("» ")
	x.send("kept = 7\r")
	x.expect("kept = 7")
	x.expect("» ")
	x.send("half typed [")
	x.expect("half typed [")
	x.cancel()
	x.send("C = [[1,\r")
	x.expect("… ")
	x.cancel()
	x.send("kept + 1\r")
	x.expect("kept + 1 = 8")
	x.leave()
}

func TestControlCStopsTheRunningStatementOnly(t *testing.T) {
	x := startPrompt(t, t.TempDir())
	x.expect("» ")
	x.send("define f(n) = if n == 0 { 0 } else { f(n - 1) + 0 }\r")
	x.expect("» ")
	x.send("L = [1, 2, 3, 4, 5, 6, 7, 8, 9, 10]\r")
	x.expect("10]\r\n» ")
	x.send("[[[[f(900) for each a of L] for each b of L] for each c of L] for each d of L]\r")
	// The end of the line on the screen: the statement runs.
	x.expect("d of L]\r\n")
	time.Sleep(100 * time.Millisecond)
	x.send("\x03")
	x.expect("stopped")
	x.expect("» ")
	x.send("L[2] + 40\r")
	x.expect("= 42")
	x.leave()
}

func TestControlDLeaves(t *testing.T) {
	x := startPrompt(t, t.TempDir())
	x.expect("» ")
	x.send("\x04")
	if status := x.wait(); status != 0 {
		t.Errorf("exit status %d", status)
	}
}

func TestTabCompletesNamesAndGreekLetters(t *testing.T) {
	x := startPrompt(t, t.TempDir())
	x.expect("» ")
	x.send("omega\t = 3\r")
	x.expect("ω = 3\r\n")
	x.send("Omega\t = 4\r")
	x.expect("Ω = 4\r\n")
	x.send("trolley_mass = 1200\r")
	x.expect("trolley_mass = 1200\r\n")
	x.send("trol\t * 2\r")
	x.expect("trolley_mass * 2 = 2400")
	x.send("requ\tω == 3\r")
	x.expect("met")
	x.leave()
}

func TestHistoryIsKeptBetweenSessions(t *testing.T) {
	folder := t.TempDir()
	x := startPrompt(t, folder)
	x.expect("» ")
	x.send("M = [[1, 2],\r")
	x.expect("… ")
	x.send("[3, 5]]\r")
	x.expect("3   5")
	x.leave()
	info, err := os.Stat(filepath.Join(folder, "state", "gainwright", "history"))
	if err != nil {
		t.Fatal(err)
	}
	if info.Mode().Perm()&0o077 != 0 {
		t.Errorf("others may read the history: %v", info.Mode())
	}
	y := startPrompt(t, folder)
	y.expect("» ")
	y.send("\x1b[A") // leave session
	y.expect("leave session")
	y.send("\x1b[A") // the matrix, its two lines on one
	y.expect("⏎")
	y.send("\r")
	y.expect("3   5")
	y.leave()
}

func TestHistoryThatCannotBeWrittenIsNoReasonToFail(t *testing.T) {
	folder := t.TempDir()
	blocked := filepath.Join(folder, "a file")
	if err := os.WriteFile(blocked, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	x := startPrompt(t, folder, "XDG_STATE_HOME="+blocked)
	x.expect("» ")
	x.send("1 + 1\r")
	x.expect("1 + 1 = 2")
	if status := x.leave(); status != 0 {
		t.Errorf("exit status %d", status)
	}
}

func TestPastedLinesRunOneAfterTheOther(t *testing.T) {
	for name, paste := range map[string]string{
		"plain":     "a = 2\rb = [[a, 1],\r\t[0, 1]]\rb[1, 1] + 5\r",
		"bracketed": "\x1b[200~a = 2\rb = [[a, 1],\r\t[0, 1]]\rb[1, 1] + 5\r\x1b[201~",
	} {
		t.Run(name, func(t *testing.T) {
			x := startPrompt(t, t.TempDir())
			x.expect("» ")
			x.send(paste)
			x.expect("b[1, 1] + 5 = 7")
			x.leave()
		})
	}
}

func TestColourOnATerminalUnlessRefused(t *testing.T) {
	x := startPrompt(t, t.TempDir(), "NO_COLOR=")
	x.expect("» ")
	x.send("require 1 > 2\r")
	x.expect("\x1b[31mmissed\x1b[0m")
	x.leave()
	y := startPrompt(t, t.TempDir(), "NO_COLOR=1")
	y.expect("» ")
	y.send("require 1 > 2\r")
	y.expect("missed     1 > 2")
	y.leave()
	if strings.Contains(y.seen(), "\x1b[31m") {
		t.Error("coloured in spite of NO_COLOR")
	}
}

func TestKeepInWritesTheSession(t *testing.T) {
	x := startPrompt(t, t.TempDir())
	x.expect("» ")
	x.send("keep in session.gain\r")
	x.expect("there is nothing to keep yet")
	x.send("a = 5\r")
	x.expect("a = 5\r\n")
	x.send("keep in session.gain\r")
	x.expect("session.gain written, 1 line\r\n")
	x.leave()
	text, err := os.ReadFile(filepath.Join(x.folder, "session.gain"))
	if err != nil || string(text) != "a = 5\n" {
		t.Errorf("the kept file holds %q, %v", text, err)
	}
}

func TestTheTerminalIsGivenBack(t *testing.T) {
	x := startAtTerminal(t, t.TempDir(), exec.Command("sh", "-c", "gainwright; stty -a | tr ' ' '\\n' | grep echo$"))
	x.expect("» ")
	x.leave()
	<-x.ended
	lines := strings.Fields(x.seen()[x.read:])
	if !slices.Contains(lines, "echo") || slices.Contains(lines, "-echo") {
		t.Errorf("the terminal's modes afterwards: %q", lines)
	}
}
