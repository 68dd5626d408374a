package slurm_test

import (
	"os"
	"regexp"
	"strconv"
	"strings"
	"syscall"
	"testing"

	"rimlight/runner/command"
)

// TestSlurm runs a recipe on a real Slurm, and disturbs it.
func TestSlurm(t *testing.T) {
	if testing.Short() {
		t.Skip("starts a cluster")
	}
	c := startCluster(t)
	undisturbed := newBench(t)
	undisturbed.run(command.ExitDone)
	want := undisturbed.tree()

	// Work of a millisecond goes to the cluster.
	on := []string{"--on", "slurm", "--slurm-over", "1ms", "--slurm-poll", "200ms"}
	slow := append([]string{"--slurm-chunk", "1ms"}, on...) // an element to a chunk
	same := func(t *testing.T, b *bench) {
		t.Helper()
		if got := b.tree(); got != want {
			t.Errorf("the results are\n%s\nexpected, as computed here,\n%s", got, want)
		}
		b.clean()
	}

	t.Run("same bytes", func(t *testing.T) {
		b := newBench(t, append([]string{"--slurm-over", "0", "--slurm-chunk", "500ms", "--slurm-cpus", "2"}, on[:2]...)...)
		r, said := b.run(command.ExitDone, "--slurm-poll", "200ms")
		same(t, b)
		for _, s := range r.Steps {
			if !strings.Contains(s.Host, "Slurm job") {
				t.Errorf("step %s ran on %q", s.Name, s.Host)
			}
			if !regexp.MustCompile(s.Name + ` .*Slurm job`).MatchString(said) {
				t.Errorf("it did not say that %s was on the cluster:\n%s", s.Name, said)
			}
		}
		log, err := os.ReadFile(b.path("r.out", "slurm", "Measure.log"))
		if err != nil || !strings.Contains(string(log), "units have results") {
			t.Errorf("the log is %q, error %v", log, err)
		}
	})

	// MaxArraySize is less than the chunks that the channels make.
	t.Run("array limit", func(t *testing.T) {
		b := newBench(t, slow...)
		b.run(command.ExitDone)
		same(t, b)
		log, _ := os.ReadFile(b.path("r.out", "slurm", "Measure.log"))
		arrays := map[string]bool{}
		for _, m := range regexp.MustCompile(`Slurm job (\d+)_\d`).FindAllStringSubmatch(string(log), -1) {
			arrays[m[1]] = true
		}
		if len(arrays) < 2 {
			t.Errorf("there were %d arrays:\n%s", len(arrays), log)
		}
	})

	t.Run("a failing element", func(t *testing.T) {
		b := newBench(t, slow...)
		_, said := b.run(command.ExitFailed, "--set", "bad=9", "--set", "loops=20000", "--no-gaps")
		if !strings.Contains(said, "element 10: ") || !strings.Contains(said, "this channel is bad") {
			t.Errorf("it said\n%s", said)
		}
		b.clean()
		// With gaps, a run here and one there come to the same.
		gap := newBench(t)
		gap.run(command.ExitCheckFailed, "--set", "bad=9", "--set", "loops=20000")
		b.run(command.ExitCheckFailed, "--set", "bad=9", "--set", "loops=20000")
		if b.tree() != gap.tree() {
			t.Errorf("with a gap, the results are\n%s\nexpected\n%s", b.tree(), gap.tree())
		}
	})

	t.Run("a job that is killed", func(t *testing.T) {
		b := newBench(t, append([]string{"--slurm-chunk", "2s"}, on...)...)
		p, said := b.start()
		var pids []int
		b.until("a job", func() bool { pids = b.processes("", "Measure-"); return len(pids) > 0 })
		syscall.Kill(pids[0], syscall.SIGKILL)
		b.wait(p, said, command.ExitDone)
		same(t, b)
		if !strings.Contains(said.String(), "submitted again") {
			t.Errorf("it did not say that a job was submitted again:\n%s", said)
		}
	})

	t.Run("Ctrl-C", func(t *testing.T) {
		b := newBench(t, slow...)
		p, said := b.start()
		b.until("an element from the cluster", func() bool { return len(b.records()) >= 7 })
		p.Process.Signal(os.Interrupt)
		r := b.wait(p, said, command.ExitInterrupted)
		if left := c.ask("squeue", "--noheader"); left != "" {
			t.Errorf("in the queue there is still\n%s", left)
		}
		done := 0
		for _, e := range r.Steps[1].Elements {
			if e.State == "computed" {
				done++
			}
		}
		if done < 5 || done == 16 {
			t.Errorf("%d elements were done", done)
		}
		b.clean()
		before := b.finished()
		b.run(command.ExitDone)
		b.untouched(before)
		same(t, b)
	})

	t.Run("the parent is killed", func(t *testing.T) {
		b := newBench(t, slow...)
		p, _ := b.start()
		b.until("an element from the cluster", func() bool { return len(b.records()) >= 7 })
		p.Process.Kill()
		p.Wait()
		before := b.finished()
		_, said := b.run(command.ExitDone)
		b.untouched(before)
		same(t, b)
		if !strings.Contains(said, "submitted by an earlier run") {
			t.Errorf("it did not say that it found the jobs:\n%s", said)
		}
	})

	t.Run("a node is killed", func(t *testing.T) {
		// Four elements are left for the cluster, each a job, and a node takes two.
		work := []string{"--set", "count=8", "--set", "loops=10000000"}
		undisturbed := newBench(t, work...)
		undisturbed.run(command.ExitDone)
		b := newBench(t, append(work, slow...)...)
		p, said := b.start()
		var pids []int
		b.until("a job on n2", func() bool { pids = b.processes("n2", "Measure-"); return len(pids) > 0 })
		c.kill("n2", pids)
		before := b.finished()
		b.wait(p, said, command.ExitDone)
		b.untouched(before)
		if got, want := b.tree(), undisturbed.tree(); got != want {
			t.Errorf("the results are\n%s\nexpected, as computed here,\n%s", got, want)
		}
		b.clean()
		log, _ := os.ReadFile(b.path("r.out", "slurm", "Measure.log"))
		if !strings.Contains(string(log), "restarted 1 times") {
			t.Errorf("no job was requeued:\n%s\n%s", log, said)
		}
	})
}

// processes are those of jobs that have begun, and not ended, on a node, or on
// any, of batches whose name begins so.
func (b *bench) processes(node, batch string) []int {
	var out []int
	for _, text := range b.logs() {
		m := regexp.MustCompile(`of (\S+) on (\S+), Slurm job \S+, process (\d+),`).FindStringSubmatch(text)
		if m == nil || strings.Contains(text, " end\n") || node != "" && m[2] != node || !strings.HasPrefix(m[1], batch) {
			continue
		}
		pid, _ := strconv.Atoi(m[3])
		out = append(out, pid)
	}
	return out
}
