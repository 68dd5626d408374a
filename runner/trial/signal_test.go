package trial

import (
	"bytes"
	"fmt"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"golang.org/x/sys/unix"

	"rimlight/runner/record"
)

// slow makes the elements of the recipe take longer, so that a run is caught in
// the middle.
func (b *bench) slow() *bench {
	b.write("r.md", strings.Replace(recipe, "| work | 5000 |", "| work | 40000 |", 1))
	return b
}

// caught waits until a run has kept some elements.
func (b *bench) caught(n int) {
	b.t.Helper()
	for deadline := time.Now().Add(time.Minute); ; time.Sleep(2 * time.Millisecond) {
		records, _ := filepath.Glob(filepath.Join(b.store, "records", "*", "*"))
		if len(records) >= n {
			return
		}
		if time.Now().After(deadline) {
			b.t.Fatalf("%d records after a minute", len(records))
		}
	}
}

// interrupted demands what an interrupted run has to leave: exit status 130, a
// report that says so, and a store that verifies, from which the next run goes
// on.
func (b *bench) interrupted(c *exec.Cmd, said string) {
	b.t.Helper()
	if status := c.ProcessState.ExitCode(); status != 130 {
		b.t.Fatalf("%v, expected exit status 130; it said\n%s", c.ProcessState, said)
	}
	r, err := record.Read(filepath.Join(b.out, "run.json"))
	if err != nil {
		b.t.Fatal(err)
	}
	if r.Outcome != "interrupted" || !strings.Contains(b.read("report.html"), "interrupted") {
		b.t.Errorf("the outcome is %q", r.Outcome)
	}
	says(b.t, b.verify(0), "0 damaged, 0 hints")
	if left := append(filesBelow(b.t, filepath.Join(b.store, "tmp")), filesBelow(b.t, filepath.Join(b.store, "using"))...); len(left) > 0 {
		b.t.Errorf("left are %v", left)
	}
	before := b.finished()
	if n := before["step Fit"]; n == 0 || n == elements {
		b.t.Errorf("it was interrupted with %d of %d elements", n, elements)
	}
	b.holdReuse(before, b.events(0))
}

// TestSignals interrupts runs as people and systems do, each time once and once
// more: the second signal, which often comes with the first, changes nothing.
func TestSignals(t *testing.T) {
	for _, s := range []syscall.Signal{syscall.SIGINT, syscall.SIGTERM, syscall.SIGHUP} {
		t.Run(s.String(), func(t *testing.T) {
			b := newBench(t).slow()
			c, said := b.started()
			b.caught(20)
			c.Process.Signal(s)
			c.Process.Signal(s)
			c.Wait()
			b.interrupted(c, said.String())
		})
	}
}

// TestClosedTerminal closes the terminal of a run.
func TestClosedTerminal(t *testing.T) {
	b := newBench(t).slow()
	master, err := os.OpenFile("/dev/ptmx", os.O_RDWR, 0)
	if err != nil {
		t.Skip(err)
	}
	n, err := unix.IoctlGetInt(int(master.Fd()), unix.TIOCGPTN)
	if err == nil {
		err = unix.IoctlSetPointerInt(int(master.Fd()), unix.TIOCSPTLCK, 0)
	}
	if err != nil {
		t.Fatal(err)
	}
	terminal, err := os.OpenFile(fmt.Sprintf("/dev/pts/%d", n), os.O_RDWR|syscall.O_NOCTTY, 0)
	if err != nil {
		t.Fatal(err)
	}
	c := b.command()
	c.Stdin, c.Stdout, c.Stderr = terminal, terminal, terminal
	c.SysProcAttr = &syscall.SysProcAttr{Setsid: true, Setctty: true}
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	terminal.Close()
	var said bytes.Buffer
	shown := make(chan struct{})
	go func() {
		defer close(shown)
		io.Copy(&said, master)
	}()
	b.caught(20)
	master.Close()
	<-shown
	c.Wait()
	b.interrupted(c, said.String())
}

// TestNohup has a run outlive its terminal because it was asked to.
func TestNohup(t *testing.T) {
	b := newBench(t).slow()
	c := b.command()
	c.Args = append([]string{"nohup"}, c.Args...)
	var err error
	if c.Path, err = exec.LookPath("nohup"); err != nil {
		t.Skip(err)
	}
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	b.caught(20)
	c.Process.Signal(syscall.SIGHUP)
	if err := c.Wait(); err != nil {
		t.Errorf("under nohup: %v", err)
	}
}

// TestSecondInterrupt interrupts a run that waits where it cannot be told.
func TestSecondInterrupt(t *testing.T) {
	b := newBench(t)
	fifo := filepath.Join(b.dir, "pipe") // the run waits here
	if err := syscall.Mkfifo(fifo, 0o644); err != nil {
		t.Fatal(err)
	}
	c := b.command("--in", "raw=pipe")
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	ended := make(chan error, 1)
	go func() { ended <- c.Wait() }()
	for deadline := time.After(time.Minute); ; {
		select {
		case <-ended:
			if status := c.ProcessState.String(); status != "signal: interrupt" && c.ProcessState.ExitCode() != 130 {
				t.Errorf("it ended with %s", status)
			}
			return
		case <-deadline:
			c.Process.Kill()
			t.Fatal("a run that waits for an input cannot be interrupted")
		case <-time.After(200 * time.Millisecond):
			c.Process.Signal(os.Interrupt)
		}
	}
}
