package command

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"syscall"
	"testing"
	"time"
	"unicode"

	"rimlight/runner/record"
)

// A hostile is a recipe that means harm, and how it has to end.
type hostile struct {
	name  string
	exit  int
	flags []string
	says  []string
}

func readHostile(t *testing.T) []hostile {
	t.Helper()
	files, err := filepath.Glob("../../testdata/hostile/*.txt")
	if err != nil {
		t.Fatal(err)
	}
	var out []hostile
	for _, f := range files {
		b, err := os.ReadFile(f)
		if err != nil {
			t.Fatal(err)
		}
		h := hostile{name: strings.TrimSuffix(filepath.Base(f), ".txt"), exit: -1}
		for _, line := range strings.Split(strings.TrimSpace(string(b)), "\n") {
			word, rest, _ := strings.Cut(line, " ")
			switch word {
			case "exit":
				fmt.Sscan(rest, &h.exit)
			case "flags":
				h.flags = strings.Fields(rest)
			case "says":
				h.says = append(h.says, rest)
			default:
				t.Fatalf("%s: %q", f, line)
			}
		}
		out = append(out, h)
	}
	return out
}

// Limits of what the program itself may take while it runs a hostile recipe.
// The time leaves room for a machine that is busy with other tests.
const (
	hostileTime   = 2 * time.Minute
	hostileMemory = 1 << 30
)

// runHostile runs a hostile recipe in a folder of its own, as another user when
// uid is not negative, and holds that it ends as it has to.
func runHostile(t *testing.T, h hostile, uid int) {
	t.Helper()
	if racing && slices.Contains(h.flags, "--step-memory") {
		t.Skip("a small limit of memory")
	}
	dir := t.TempDir()
	source, err := os.ReadFile(filepath.Join("../../testdata/hostile", h.name+".md"))
	if err != nil {
		t.Fatal(err)
	}
	recipe := filepath.Join(dir, h.name+".md")
	if err := os.WriteFile(recipe, source, 0o644); err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithTimeout(context.Background(), hostileTime)
	defer cancel()
	c := exec.CommandContext(ctx, "/proc/self/exe")
	c.Args = append([]string{"rimlight", "run", recipe}, h.flags...)
	c.SysProcAttr = &syscall.SysProcAttr{Setpgid: true}
	if uid >= 0 {
		for d := dir; d != os.TempDir(); d = filepath.Dir(d) {
			if err := os.Chmod(d, 0o777); err != nil {
				t.Fatal(err)
			}
		}
		c.SysProcAttr.Credential = &syscall.Credential{Uid: uint32(uid), Gid: uint32(uid)}
	}
	c.WaitDelay = time.Second
	var out, errs bytes.Buffer
	c.Stdout, c.Stderr = &out, &errs
	began := time.Now()
	err = c.Run()
	said := out.String() + errs.String()
	if ctx.Err() != nil {
		t.Fatalf("it did not end in %v", time.Since(began).Round(time.Second))
	}
	var status *exec.ExitError
	if err != nil && !errors.As(err, &status) {
		t.Fatal(err)
	}
	if got := c.ProcessState.ExitCode(); got != h.exit {
		t.Errorf("exit status %d, expected %d; it said\n%.2000s", got, h.exit, said)
	}
	for _, want := range h.says {
		if !strings.Contains(said, want) {
			t.Errorf("it did not say %q but\n%.2000s", want, said)
		}
	}
	if len(said) > 32<<10 {
		t.Errorf("it said %d bytes", len(said))
	}
	for _, r := range said {
		if unicode.IsControl(r) && r != '\n' && r != '\t' {
			t.Errorf("it said the control character %U", r)
			break
		}
	}
	if u, ok := c.ProcessState.SysUsage().(*syscall.Rusage); ok && u.Maxrss<<10 > hostileMemory {
		t.Errorf("the program itself took %d MiB of memory", u.Maxrss>>10)
	}
	if h.exit == ExitWrong {
		return
	}
	results := filepath.Join(dir, h.name+".out")
	r, err := record.Read(filepath.Join(results, recordFile))
	if err != nil {
		t.Fatal(err)
	}
	if got := stateOf(r, "Keep"); got != "computed" {
		t.Errorf("step Keep: %s", got)
	}
	report, err := os.ReadFile(filepath.Join(results, reportFile))
	if err != nil {
		t.Fatal(err)
	}
	if bytes.Contains(report, []byte("<script>alert")) {
		t.Error("the report has script from the recipe in it")
	}
	if len(report) > 8<<20 {
		t.Errorf("the report has %d bytes", len(report))
	}
	if _, err := os.Stat(filepath.Join(results, csvFile)); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("there is a spectrum (%v), although the recipe makes none", err)
	}
}

func stateOf(r *record.Record, step string) string {
	for _, s := range r.Steps {
		if s.Name == step {
			return s.State
		}
	}
	return "not in the record"
}

// TestHostileRecipes runs every recipe under testdata/hostile.
func TestHostileRecipes(t *testing.T) {
	all := readHostile(t)
	if len(all) < 25 {
		t.Fatalf("%d hostile recipes, expected at least 25", len(all))
	}
	for i, h := range all {
		if testing.Short() && i%8 != 0 {
			continue
		}
		t.Run(h.name, func(t *testing.T) {
			t.Parallel()
			runHostile(t, h, -1)
		})
	}
}

// TestHostileRecipesAsOrdinaryUser runs a few as a user without privileges,
// where the tests themselves are run by the superuser.
func TestHostileRecipesAsOrdinaryUser(t *testing.T) {
	if os.Getuid() != 0 {
		t.Skip("the other tests have done this already")
	}
	for _, h := range readHostile(t) {
		switch h.name {
		case "loop-endless", "memory-growing-slice", "recursion-endless", "panic-own-type", "forge-argument", "memory-constants":
			t.Run(h.name, func(t *testing.T) {
				t.Parallel()
				runHostile(t, h, 65534)
			})
		}
	}
}
