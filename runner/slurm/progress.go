package slurm

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"strings"

	"rimlight/runner/engine"
)

// A report is a line of a progress file: exactly one of its parts is there.
type report struct {
	Begin   string        `json:",omitempty"` // host and job
	Unit    *int          `json:",omitempty"` // by its index in the chunk, whose end this is
	Fault   *engine.Fault `json:",omitempty"` // of the unit, if it has no result
	Untried bool          `json:",omitempty"` // the unit was left alone
	Refused *engine.Fault `json:",omitempty"` // why nothing of the chunk was, or can be, computed
	End     bool          `json:",omitempty"` // nothing follows
}

// parseReports reads the whole lines of a progress file, and says how many
// bytes those were. Lines that are no report are left out.
func parseReports(data []byte) (list []report, used int) {
	for {
		n := bytes.IndexByte(data[used:], '\n')
		if n < 0 {
			return list, used
		}
		var r report
		if err := json.Unmarshal(data[used:used+n], &r); err == nil && (r.Unit == nil || *r.Unit >= 0) {
			list = append(list, r)
		}
		used += n + 1
	}
}

// A tail reads what is appended to a file.
type tail struct{ at int64 }

// next gives the reports that came since the last time. A file that is not there
// has none.
func (t *tail) next(path string) []report {
	f, err := os.Open(path)
	if err != nil {
		return nil
	}
	defer f.Close()
	data, err := io.ReadAll(io.NewSectionReader(f, t.at, 1<<40))
	if err != nil {
		return nil
	}
	list, used := parseReports(data)
	t.at += int64(used)
	return list
}

// A reporter appends reports to a progress file from one goroutine, so that
// those who report need not wait for the disk.
type reporter struct {
	lines chan report
	done  chan error
}

func newReporter(path string) (*reporter, error) {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_APPEND, 0o666)
	if err != nil {
		return nil, err
	}
	r := &reporter{make(chan report, 256), make(chan error, 1)}
	go func() {
		var failed error
		for first := range r.lines {
			batch := []report{first}
			for more := true; more; {
				select {
				case l, ok := <-r.lines:
					if more = ok; ok {
						batch = append(batch, l)
					}
				default:
					more = false
				}
			}
			failed = errors.Join(failed, write(f, batch))
		}
		r.done <- errors.Join(failed, f.Close())
	}()
	return r, nil
}

// write appends reports. The sync is what shows them to other machines.
func write(f *os.File, list []report) error {
	var b bytes.Buffer
	for _, l := range list {
		line, err := json.Marshal(l)
		if err != nil {
			return err
		}
		b.Write(append(line, '\n'))
	}
	if _, err := f.Write(b.Bytes()); err != nil {
		return err
	}
	return f.Sync()
}

// close waits until all is written.
func (r *reporter) close() error {
	close(r.lines)
	return <-r.done
}

// logTail is the end of a job's log, in one line, "" when there is none.
func logTail(path string) string {
	const most, lines = 2000, 6
	f, err := os.Open(path)
	if err != nil {
		return ""
	}
	defer f.Close()
	st, err := f.Stat()
	if err != nil {
		return ""
	}
	data, err := io.ReadAll(io.NewSectionReader(f, max(0, st.Size()-most), most))
	if err != nil {
		return ""
	}
	var kept []string
	for _, l := range strings.Split(string(data), "\n") {
		if l = strings.TrimSpace(l); l != "" {
			kept = append(kept, l)
		}
	}
	text := strings.Join(kept[max(0, len(kept)-lines):], " / ")
	return strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f {
			return ' '
		}
		return r
	}, strings.ToValidUTF8(text, "�"))
}

func logName(job, index int) string { return fmt.Sprintf("log-%d_%d.txt", job, index) }
