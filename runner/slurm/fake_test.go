package slurm_test

import (
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"rimlight/runner/command"
)

// The commands of a Slurm without a queue: what is submitted begins at once, on
// this machine. Files in the folder FAKE make them misbehave.
var fakes = map[string]string{
	"scontrol": `echo "MaxArraySize            = 1001"`,

	// full: no more than so many elements are taken. refuse: what it holds is said,
	// and nothing taken. doomed: what is submitted says what it holds, and dies.
	// held: so many arrays cannot be started, and stay in the queue. stuck: nothing
	// is ever started.
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
echo $((last + 1)) >>FAKE/submitted
job=$(wc -l <FAKE/submitted)
cat >FAKE/script-$job
held=$(cat FAKE/held 2>/dev/null || echo 0)
i=0
while [ $i -le $last ]; do
	if [ $job -le $held ]; then
		echo "$job|$i|PENDING|$name||launch failed requeued held" >FAKE/queue/${job}_$i
		i=$((i + 1)); continue
	fi
	if [ -f FAKE/stuck ]; then
		echo "$job|$i|PENDING|$name||Resources" >FAKE/queue/${job}_$i
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

	"scancel": `
for a; do case $a in
--name=*) for q in $(grep -lF "|${a#--name=}|" FAKE/queue/*); do rm -f $q; done ;;
--*) ;;
*) rm -f FAKE/queue/$a ;;
esac; done`,
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

// jobs is how many jobs the arrays had together.
func (f *fake) jobs() int {
	text, _ := os.ReadFile(filepath.Join(f.dir, "submitted"))
	sum := 0
	for _, array := range strings.Fields(string(text)) {
		n, err := strconv.Atoi(array)
		if err != nil {
			f.t.Fatal(err)
		}
		sum += n
	}
	return sum
}

// queued is how many elements are in the queue.
func (f *fake) queued() int {
	entries, _ := os.ReadDir(filepath.Join(f.dir, "queue"))
	return len(entries)
}

// TestWhereStepsGo holds that work goes to the cluster by what is known of it.
func TestWhereStepsGo(t *testing.T) {
	t.Parallel()
	b := newBench(t, "--on", "slurm", "--slurm-poll", "50ms")
	f := newFake(t, b)
	away := func(want string, args ...string) {
		t.Helper()
		r, said := b.run(command.ExitDone, args...)
		var got []string
		for _, s := range r.Steps {
			n := strings.Count(s.Host, "Slurm job")
			for _, e := range s.Elements {
				n += strings.Count(e.Host, "Slurm job")
			}
			if n > 0 && len(s.Elements) > 0 {
				n -= strings.Count(s.Host, "Slurm job") // which says it again
			}
			got = append(got, strconv.Itoa(n))
		}
		if strings.Join(got, " ") != want {
			t.Errorf("%v: of List, Measure, Assemble %v were on the cluster, expected %s; it said\n%s", args, got, want, said)
		}
	}
	away("0 4 0", "--set", "count=8", "--set", "loops=20000", "--slurm-over", "1us") // nothing is known: a first wave here
	arrays := f.arrays()
	away("0 0 0", "--set", "count=8", "--set", "loops=20001", "--slurm-over", "1h")
	away("0 0 0", "--set", "count=8", "--set", "loops=20002", "--slurm-over", "1us", "--again", "Measure", "--again", "Assemble")
	if f.arrays() != arrays {
		t.Errorf("%d arrays were submitted of what stays here", f.arrays()-arrays)
	}
	away("0 8 1", "--set", "count=8", "--set", "loops=20003", "--slurm-over", "1us") // known from the run before
	away("1 9 1", "--set", "count=9", "--set", "loops=20004", "--slurm-over", "0")
}

// TestDamagedArgument holds that what a node finds damaged is mended by the
// parent, and then computed with.
func TestDamagedArgument(t *testing.T) {
	t.Parallel()
	args := []string{"--set", "count=8", "--set", "loops=20001"}
	undisturbed := newBench(t)
	undisturbed.run(command.ExitDone, "--set", "count=8", "--set", "loops=20000")
	undisturbed.run(command.ExitDone, args...)
	b := newBench(t)
	newFake(t, b)
	b.run(command.ExitDone, "--set", "count=8", "--set", "loops=20000")
	objects, _ := filepath.Glob(b.path("rimlight.store", "objects", "*", "*"))
	for _, o := range objects {
		text, _ := os.ReadFile(o)
		if lines := strings.Split(string(text), "\n"); strings.HasPrefix(string(text), "rimlight list 1\ntype []rimlight/steps/lightcurve.Curve\n") {
			element := strings.Fields(lines[6])[0]
			name := b.path("rimlight.store", "objects", element[:2], element)
			os.Chmod(name, 0o644)
			os.Truncate(name, 40)
		}
	}
	_, said := b.run(command.ExitDone, append(args, "--on", "slurm", "--slurm-over", "1us", "--slurm-poll", "50ms")...)
	if got, want := b.tree(), undisturbed.tree(); got != want {
		t.Errorf("the results are\n%s\nexpected\n%s", got, want)
	}
	if !strings.Contains(said, "damaged") && !strings.Contains(said, "missing") {
		t.Errorf("it did not say that something was damaged:\n%s", said)
	}
}

// TestTakingOver holds that jobs of a killed run that nobody needs are cancelled,
// and that those needed are not submitted again.
func TestTakingOver(t *testing.T) {
	t.Parallel()
	b := newBench(t, "--on", "slurm", "--slurm-over", "1us", "--slurm-poll", "50ms", "--slurm-chunk", "1ns", "--set", "count=8")
	f := newFake(t, b)
	f.set("stuck", "")
	killed := func(args ...string) {
		c, _ := b.start(args...)
		b.until("jobs in the queue", func() bool { return f.queued() == 4 })
		time.Sleep(300 * time.Millisecond) // so that it comes to wait
		c.Process.Kill()
		c.Wait()
	}
	killed("--set", "loops=20000")
	killed("--set", "loops=20000") // finds them
	if f.arrays() != 1 || f.queued() != 4 {
		t.Errorf("%d arrays were submitted, %d elements are in the queue", f.arrays(), f.queued())
	}
	os.Remove(filepath.Join(f.dir, "stuck"))
	_, said := b.run(command.ExitDone, "--set", "loops=20001")
	if !strings.Contains(said, "of an earlier run were cancelled") || f.queued() != 0 {
		t.Errorf("%d elements are in the queue; it said\n%s", f.queued(), said)
	}
	b.clean()
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
		// Four of the eight elements are computed here, to see what one costs. How
		// many arrays the others make depends on how soon there is room again.
		if f.arrays() < 2 || f.jobs() != 4 {
			t.Errorf("there were %d arrays of %d jobs, expected at least 2 of 4", f.arrays(), f.jobs())
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
		// Three for each of four elements. Those of a round may have ended at
		// different times, and then go on in arrays of their own.
		if f.arrays() < 3 || f.jobs() != 12 {
			t.Errorf("there were %d arrays of %d jobs, expected at least 3 of 12", f.arrays(), f.jobs())
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
