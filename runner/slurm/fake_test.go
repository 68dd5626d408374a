package slurm_test

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"rimlight/runner/command"
)

// The commands of a Slurm without a queue: what is submitted begins at once, on
// this machine. Files in the folder FAKE make them misbehave.
var fakes = map[string]string{
	"scontrol": `echo "MaxArraySize            = 1001"`,

	// full: no more than so many elements are taken. refuse: what it holds is said,
	// and nothing taken. doomed: what is submitted says what it holds, and dies.
	// held: so many arrays cannot be started, and stay in the queue.
	"sbatch": `
for a; do case $a in
--array=0-*) last=${a#--array=0-} ;;
--output=*) log=${a#--output=} ;;
--job-name=*) name=${a#--job-name=} ;;
esac; done
if [ -f FAKE/refuse ]; then cat FAKE/refuse >&2; exit 1; fi
queued=$(ls FAKE/queue | wc -l)
if [ -f FAKE/full ] && [ $((queued + last + 1)) -gt $(cat FAKE/full) ]; then
	echo "sbatch: error: AssocMaxSubmitJobLimit" >&2
	echo "sbatch: error: Batch job submission failed: Job violates accounting/QOS policy (job submit limit, user's size and/or time limits)" >&2
	exit 1
fi
echo x >>FAKE/submitted
job=$(wc -l <FAKE/submitted)
cat >FAKE/script-$job
held=$(cat FAKE/held 2>/dev/null || echo 0)
i=0
while [ $i -le $last ]; do
	if [ $job -le $held ]; then
		echo "$job|$i|PENDING|$name||launch failed requeued held" >FAKE/queue/${job}_$i
		i=$((i + 1)); continue
	fi
	echo "$job|$i|RUNNING|$name|n1|None" >FAKE/queue/${job}_$i
	out=$(echo $log | sed "s/%A_%a/${job}_$i/")
	(
		if [ -f FAKE/doomed ]; then cp FAKE/doomed $out; else
			SLURM_JOB_ID=$((1000 * job + i)) SLURM_ARRAY_JOB_ID=$job SLURM_ARRAY_TASK_ID=$i SLURMD_NODENAME=n1 sh FAKE/script-$job
		fi >>$out 2>&1
		rm -f FAKE/queue/${job}_$i
	) >/dev/null 2>&1 </dev/null &
	i=$((i + 1))
done
echo "$job;fake"`,

	// deaf: so many times it does not answer.
	"squeue": `
n=$(cat FAKE/deaf 2>/dev/null || echo 0)
if [ $n -gt 0 ]; then echo $((n - 1)) >FAKE/deaf; echo "slurm_load_jobs error: Unable to contact slurm controller (connect failure)" >&2; exit 1; fi
echo "a greeting of the site"
cat FAKE/queue/* 2>/dev/null
true`,

	"scancel": `for a; do case $a in --*) ;; *) rm -f FAKE/queue/$a ;; esac; done`,
}

// A fake is the folder of such commands, first in the path of the bench.
type fake struct {
	t   *testing.T
	dir string
}

func newFake(t *testing.T, b *bench) *fake {
	f := &fake{t, t.TempDir()}
	os.Mkdir(filepath.Join(f.dir, "queue"), 0o755)
	for name, text := range fakes {
		text = "#!/bin/sh\n" + strings.ReplaceAll(text, "FAKE", f.dir) + "\n"
		if err := os.WriteFile(filepath.Join(f.dir, name), []byte(text), 0o755); err != nil {
			t.Fatal(err)
		}
	}
	b.env = []string{"PATH=" + f.dir + ":" + os.Getenv("PATH")}
	return f
}

func (f *fake) set(name, text string) {
	if err := os.WriteFile(filepath.Join(f.dir, name), []byte(text), 0o644); err != nil {
		f.t.Fatal(err)
	}
}

// arrays is how many were submitted.
func (f *fake) arrays() int {
	text, _ := os.ReadFile(filepath.Join(f.dir, "submitted"))
	return strings.Count(string(text), "\n")
}

// TestMisbehaviour holds that a run comes to its results, or to an error that
// says why not, whatever Slurm does.
func TestMisbehaviour(t *testing.T) {
	args := []string{"--on", "slurm", "--slurm-over", "1us", "--slurm-poll", "50ms", "--set", "count=8", "--set", "loops=20000", "--slurm-chunk", "1ns"}
	local := newBench(t)
	local.run(command.ExitDone, "--set", "count=8", "--set", "loops=20000")
	want := local.tree()
	same := func(t *testing.T, b *bench) {
		t.Helper()
		if got := b.tree(); got != want {
			t.Errorf("the results are\n%s\nexpected\n%s", got, want)
		}
		b.clean()
	}
	t.Run("it takes few jobs at a time", func(t *testing.T) {
		t.Parallel()
		b := newBench(t, args...)
		f := newFake(t, b)
		f.set("full", "2")
		b.run(command.ExitDone)
		same(t, b)
		if n := f.arrays(); n < 3 { // four elements to go, of a first step here and a first wave
			t.Errorf("there were %d arrays", n)
		}
	})
	t.Run("it does not answer at first", func(t *testing.T) {
		t.Parallel()
		b := newBench(t, args...)
		f := newFake(t, b)
		f.set("deaf", "7")
		b.run(command.ExitDone)
		same(t, b)
	})
	t.Run("it cannot start a job", func(t *testing.T) {
		t.Parallel()
		b := newBench(t, args...)
		f := newFake(t, b)
		f.set("held", "1")
		_, said := b.run(command.ExitDone)
		same(t, b)
		if !strings.Contains(said, "do the nodes see the folder") {
			t.Errorf("it said\n%s", said)
		}
	})
	t.Run("its jobs all die", func(t *testing.T) {
		t.Parallel()
		b := newBench(t, args...)
		f := newFake(t, b)
		f.set("doomed", "slurmstepd: error: Detected 1 oom_kill event\n")
		_, said := b.run(command.ExitFailed, "--no-gaps")
		if !strings.Contains(said, "Slurm jobs ended before they had computed it") || !strings.Contains(said, "Detected 1 oom_kill event") {
			t.Errorf("it said\n%s", said)
		}
		if n := f.arrays(); n != 3 {
			t.Errorf("there were %d arrays, expected 3", n)
		}
		b.clean()
		os.Remove(filepath.Join(f.dir, "doomed"))
		b.run(command.ExitDone)
		same(t, b)
	})
	t.Run("it refuses", func(t *testing.T) {
		t.Parallel()
		b := newBench(t, args...)
		f := newFake(t, b)
		f.set("refuse", "sbatch: error: invalid partition specified: moon\nsbatch: error: Batch job submission failed: Invalid partition name specified\n")
		_, said := b.run(command.ExitFailed)
		if !strings.Contains(said, "Slurm refuses the work: sbatch: sbatch: error: invalid partition specified: moon") {
			t.Errorf("it said\n%s", said)
		}
		b.clean()
	})
	t.Run("it is not there", func(t *testing.T) {
		t.Parallel()
		b := newBench(t, args...)
		b.env = []string{"PATH=/nowhere"}
		c, said := b.start()
		if c.Wait(); c.ProcessState.ExitCode() != command.ExitWrong || !strings.Contains(said.String(), "there is no scontrol on this machine") {
			t.Errorf("exit status %d; it said\n%s", c.ProcessState.ExitCode(), said)
		}
	})
}
