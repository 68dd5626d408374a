package slurm

import (
	"context"
	"fmt"
	"io"
	"os"
	"reflect"
	"slices"
	"strings"
	"testing"
	"time"

	"rimlight/runner/engine"
	"rimlight/runner/plan"
	"rimlight/runner/worker"
)

// queueText is what squeue of Slurm 22.05 wrote, and lines that sites add.
const queueText = `welcome to the cluster
1|0|RUNNING|rimlight-Fit-1a2b3c4d|n1|None
1|3|PENDING|rimlight-Fit-1a2b3c4d||Resources
2|N/A|PENDING|rimlight-White-00000000||AssocGrpCPULimit
3|7|PENDING|rimlight-x-1||launch failed requeued held
4|1|COMPLETING|a name|n[1-2]|None
5|2|NODE_FAIL|x|n2|odd | reason
x|2|RUNNING|x|n2|None
6||RUNNING
`

func TestParseQueue(t *testing.T) {
	want := []task{
		{1, 0, "rimlight-Fit-1a2b3c4d", "RUNNING", "n1", ""},
		{1, 3, "rimlight-Fit-1a2b3c4d", "PENDING", "", "Resources"},
		{2, 0, "rimlight-White-00000000", "PENDING", "", "AssocGrpCPULimit"},
		{3, 7, "rimlight-x-1", "PENDING", "", "launch failed requeued held"},
		{4, 1, "a name", "COMPLETING", "n[1-2]", ""},
		{5, 2, "x", "NODE_FAIL", "n2", "odd | reason"},
	}
	got := parseQueue(queueText)
	if !reflect.DeepEqual(got, want) {
		t.Errorf("got %v, expected %v", got, want)
	}
	for i, alive := range []bool{true, true, true, false, true, false} {
		if got[i].alive() != alive {
			t.Errorf("%v: alive is %v", got[i], !alive)
		}
	}
}

func TestParseJob(t *testing.T) {
	for text, want := range map[string]int{"17\n": 17, "17;cluster\n": 17, "a warning\n18\n": 18, "": 0, "Submitted": 0, "-3": 0} {
		got, err := parseJob(text)
		if got != want || (err == nil) != (want > 0) {
			t.Errorf("%q gives %d, %v", text, got, err)
		}
	}
}

func TestParseArrayLimit(t *testing.T) {
	for text, want := range map[string]int{
		"Configuration data as of 2030\nMaxArraySize            = 4\nMaxJobCount             = 10000\n": 4,
		"MaxArraySize = 100001\nMaxJobCount = 500":                                                      500,
		"MaxArraySize = 0":    0,
		"MaxArraySize = many": defaultArray,
		"":                    defaultArray,
	} {
		if got := parseArrayLimit(text); got != want {
			t.Errorf("%q gives %d, expected %d", text, got, want)
		}
	}
}

func TestJudge(t *testing.T) {
	for text, want := range map[string]refusal{
		"sbatch: error: AssocMaxSubmitJobLimit":                                                                       tooMany,
		"sbatch: error: QOSMaxSubmitJobPerUserLimit":                                                                  tooMany,
		"sbatch: error: Batch job submission failed: Invalid job array specification":                                 tooMany,
		"sbatch: error: Slurm temporarily unable to accept job, sleeping and retrying":                                tooMany,
		"sbatch: error: Batch job submission failed: Unable to contact slurm controller (connect failure)":            notReady,
		"sbatch: error: Batch job submission failed: Socket timed out on send/recv operation":                         notReady,
		"sbatch: error: Batch job submission failed: Requested time limit is invalid (missing or exceeds some limit)": final,
		"sbatch: error: Memory specification can not be satisfied":                                                    final,
		"sbatch: error: Batch job submission failed: Invalid account or account/partition combination specified":      final,
		"sbatch: error: Batch job submission failed: Requested node configuration is not available":                   final,
		"sbatch: error: Batch job submission failed: User's group not permitted to use this partition":                final,
	} {
		if got := judge(text); got != want {
			t.Errorf("%q is judged %d, expected %d", text, got, want)
		}
	}
}

func TestSizes(t *testing.T) {
	o := Options{CPUs: 2, Chunk: time.Minute}
	for _, c := range []struct {
		n    int
		each time.Duration
		want []int
	}{
		{10, time.Hour, []int{1, 1, 1, 1, 1, 1, 1, 1, 1, 1}},
		{10, 30 * time.Second, []int{3, 3, 4}},
		{10, time.Second, []int{10}},
		{3, 0, []int{1, 1, 1}}, // nothing is known: the first wave
	} {
		if got := o.sizes(c.n, c.each); !slices.Equal(got, c.want) {
			t.Errorf("%d of %v: %v, expected %v", c.n, c.each, got, c.want)
		}
	}
}

func TestRequest(t *testing.T) {
	limits := worker.Options{StepTime: time.Hour, Memory: 2 << 30}
	o := Options{CPUs: 4, Partition: "long", Account: "transits", Extra: []string{"--qos=night"}}
	got := strings.Join(o.request(100, time.Minute, limits), " ")
	if want := "--nodes=1 --ntasks=1 --cpus-per-task=4 --time=105 --mem=9216M --partition=long --account=transits --qos=night"; got != want {
		t.Errorf("by itself it asks for %s, expected %s", got, want)
	}
	o = Options{CPUs: 1, Time: 90 * time.Second, Memory: 1e9}
	got = strings.Join(o.request(100, time.Minute, limits), " ")
	if want := "--nodes=1 --ntasks=1 --cpus-per-task=1 --time=2 --mem=954M"; got != want {
		t.Errorf("as told it asks for %s, expected %s", got, want)
	}
}

func TestJobsFile(t *testing.T) {
	got := parseJobs([]byte("0 4\n0 4 17\n4 4\n4 2\n4 2 18\nx\n6 2\n8 "))
	want := []array{{0, 4, 17}, {4, 2, 18}, {6, 2, 0}}
	if !slices.Equal(got, want) {
		t.Errorf("got %v, expected %v", got, want)
	}
}

// TestChunkRefusals holds that nothing is computed for a parent whose program
// would compute something else, nor from a batch that is not whole.
func TestChunkRefusals(t *testing.T) {
	b, err := newBatch(t.TempDir(), workFile{Program: "rimlight key 1\nlibrary rimlight/steps/fit 00\n", Store: t.TempDir(), Work: engine.Work{Step: "Fit"}})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := b.add([]engine.Unit{{Text: "x"}}); err != nil {
		t.Fatal(err)
	}
	refused := func() string {
		if err := RunChunk(context.Background(), b.dir, 0, io.Discard); err != nil {
			t.Fatal(err)
		}
		var text tail
		for _, r := range text.next(b.path(progressName(0))) {
			if r.Unit != nil {
				t.Errorf("a unit ended: %v", r)
			}
			if r.Refused != nil {
				return r.Refused.Text
			}
		}
		return "not refused"
	}
	if got := refused(); !strings.Contains(got, "would not compute the same") || !strings.Contains(got, "library changed: steps/fit") {
		t.Errorf("it was %q", got)
	}
	lib, err := plan.OpenLibrary()
	if err != nil {
		t.Fatal(err)
	}
	b.work.Program = plan.Fingerprint(lib, plan.ReadBuild())
	os.WriteFile(b.path(progressName(0)), nil, 0o644)
	b.writeJSON(workName, b.work)
	if got := refused(); !strings.Contains(got, "there is no store") {
		t.Errorf("it was %q", got)
	}
	os.WriteFile(b.path(progressName(0)), nil, 0o644)
	os.WriteFile(b.path(workName), []byte(`{"Format":"rimlight slurm batch 99"}`), 0o644)
	if got := refused(); !strings.Contains(got, `expected "rimlight slurm batch 1"`) {
		t.Errorf("it was %q", got)
	}
}

func FuzzParse(f *testing.F) {
	f.Add(queueText)
	f.Add("17;cluster\n")
	f.Add("0 4\n0 4 17\n4 4\n")
	f.Add(`{"Begin":"n1"}` + "\n" + `{"Unit":3,"Fault":{"Text":"x"}}` + "\n" + `{"End":true}` + "\n{")
	f.Add("MaxArraySize = 4\n")
	f.Fuzz(func(t *testing.T, text string) {
		for _, x := range parseQueue(text) {
			if x.job <= 0 || x.index < 0 || x.state == "" {
				t.Errorf("%q gives %v", text, x)
			}
			line := fmt.Sprintf("%d|%d|%s|%s|%s|%s", x.job, x.index, x.state, x.name, x.node, x.reason)
			if again := parseQueue(line); strings.TrimSpace(line) == line && (len(again) != 1 || again[0] != x) {
				t.Errorf("%q gives %v, which gives %v", text, x, again)
			}
		}
		if n, err := parseJob(text); err == nil && n <= 0 {
			t.Errorf("%q is job %d", text, n)
		}
		if n := parseArrayLimit(text); n < 0 {
			t.Errorf("%q gives the limit %d", text, n)
		}
		for _, a := range parseJobs([]byte(text)) {
			if a.first < 0 || a.count <= 0 || a.count > maxUnits || a.job < 0 {
				t.Errorf("%q gives %v", text, a)
			}
		}
		list, used := parseReports([]byte(text))
		if used != strings.LastIndexByte(text, '\n')+1 {
			t.Errorf("%q: %d bytes used", text, used)
		}
		for _, r := range list {
			if r.Unit != nil && *r.Unit < 0 {
				t.Errorf("%q ends unit %d", text, *r.Unit)
			}
		}
		judge(text)
	})
}
