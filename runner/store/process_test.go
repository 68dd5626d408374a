package store

import (
	"errors"
	"fmt"
	"os"
	"os/exec"
	"strings"
	"testing"
	"time"
)

// racer, in the environment, makes the test binary one of several processes
// that use one store.
const racer = "RIMLIGHT_TEST_STORE"

func TestMain(m *testing.M) {
	if dir := os.Getenv(racer); dir != "" {
		if err := race(dir, os.Args[1]); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		os.Exit(0)
	}
	os.Exit(m.Run())
}

const (
	racers  = 3
	records = 30
)

// race puts what all racers put, and sets records whose results differ between
// them in every third. It prints the numbers of records of others that were
// there first.
func race(dir, who string) error {
	s, err := Open(dir)
	if err != nil {
		return err
	}
	if who == "killed" { // in the middle of writing a second object
		if _, err := s.Put([]byte("complete")); err != nil {
			return err
		}
		s.files.write = func(f *os.File, b []byte) (int, error) {
			n, _ := f.Write(b[:3])
			p, err := os.FindProcess(os.Getpid())
			if err == nil {
				err = p.Kill()
			}
			time.Sleep(time.Minute)
			return n, err
		}
		_, err := s.Put([]byte("half"))
		return err
	}
	for i := range records {
		shared, err := s.Put(fmt.Appendf(nil, "object %d", i))
		if err != nil {
			return err
		}
		own, err := s.Put(fmt.Appendf(nil, "object %d of racer %s", i, who))
		if err != nil {
			return err
		}
		h := shared
		if i%3 == 0 {
			h = own
		}
		var differs *NotReproducibleError
		if err := s.SetRecord(record(fmt.Sprint("key ", i), "depth", h)); errors.As(err, &differs) {
			fmt.Println(i)
		} else if err != nil {
			return err
		}
	}
	return nil
}

// child makes the test binary a racer.
func child(s *Store, who string) *exec.Cmd {
	cmd := exec.Command(os.Args[0], who)
	cmd.Env = append(os.Environ(), racer+"="+s.dir)
	return cmd
}

func TestProcesses(t *testing.T) {
	s := open(t)
	type outcome struct {
		out []byte
		err error
	}
	outcomes := make(chan outcome)
	for i := range racers {
		go func() {
			out, err := child(s, fmt.Sprint(i)).CombinedOutput()
			outcomes <- outcome{out, err}
		}()
	}
	late := map[string]int{}
	for range racers {
		o := <-outcomes
		if o.err != nil {
			t.Fatalf("%v\n%s", o.err, o.out)
		}
		for _, i := range strings.Fields(string(o.out)) {
			late[i]++
		}
	}
	for i := range records {
		want := 0
		if i%3 == 0 {
			want = racers - 1 // all but the first
		}
		if n := late[fmt.Sprint(i)]; n != want {
			t.Errorf("record %d was there for %d processes, expected %d", i, n, want)
		}
		r, ok, err := s.Record(KeyOf(fmt.Sprint("key ", i)))
		if !ok || err != nil {
			t.Fatalf("record %d: %v, %v", i, ok, err)
		}
		if _, err := s.Get(r.Results[0].Hash); err != nil {
			t.Error(err)
		}
	}
	hints, errs, err := s.Verify(nil)
	if len(errs) > 0 || err != nil || len(hints) != records/3*(racers-1) {
		t.Errorf("%v, %v, %v", hints, errs, err)
	}
	if n := len(tree(t, s, "damaged")) + len(tree(t, s, "tmp")); n > 0 {
		t.Errorf("%d files are left", n)
	}
}

// TestKilled kills a process while it writes an object, and between that and
// its record.
func TestKilled(t *testing.T) {
	s := open(t)
	out, err := child(s, "killed").CombinedOutput()
	var exit *exec.ExitError
	if !errors.As(err, &exit) || exit.Exited() {
		t.Fatalf("it was not killed: %v\n%s", err, out)
	}
	if !s.Has(HashOf([]byte("complete"))) || s.Has(HashOf([]byte("half"))) {
		t.Error("expected the complete object, and not the half one")
	}
	if n := len(tree(t, s, "tmp")); n != 1 {
		t.Errorf("%d temporary files, expected 1", n)
	}
	if hints, errs, err := s.Verify(nil); len(hints)+len(errs) > 0 || err != nil {
		t.Errorf("%v, %v, %v", hints, errs, err)
	}
	if h := put(t, s, "half"); !s.Has(h[0]) {
		t.Error("the object could not be put afterwards")
	}
}
