package store

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"syscall"
	"testing"
	"time"
)

// record is a record with one result.
func record(key, name string, h Hash) Record {
	return Record{
		Key: KeyOf(key), Text: key, Results: []Result{{name, "float64", "float64", h, 5}}, Log: "said <this> & that\nand more\n",
		Took: 1500 * time.Millisecond, When: time.Date(2031, 5, 17, 12, 0, 0, 42, time.UTC), Host: "dome", Program: "rimlight 1.0", Notes: []string{"slow"},
	}
}

// put puts texts and gives their names.
func put(t testing.TB, s *Store, texts ...string) []Hash {
	t.Helper()
	var hashes []Hash
	for _, text := range texts {
		h, err := s.Put([]byte(text))
		if err != nil {
			t.Fatal(err)
		}
		hashes = append(hashes, h)
	}
	return hashes
}

func TestRecord(t *testing.T) {
	s := open(t)
	h := put(t, s, "a", "b")
	full := record("step Clean\ncode 12\n", "clean", h[0])
	full.Results = append(full.Results, Result{"count", "int", "int", h[1], 1 << 40})
	for _, want := range []Record{full, {Key: KeyOf("")}, {Key: KeyOf("x\r\n\n\u2028"), Text: "x\r\n\n\u2028", Took: -1}} {
		if _, ok, err := s.Record(want.Key); ok || err != nil {
			t.Errorf("before: %v, %v", ok, err)
		}
		if err := s.SetRecord(want); err != nil {
			t.Fatal(err)
		}
		got, ok, err := s.Record(want.Key)
		if !ok || err != nil || !got.When.Equal(want.When) {
			t.Errorf("%v, %v, %v", got, ok, err)
		}
		got.When = want.When
		if len(got.Results)+len(got.Notes) == 0 {
			got.Results, got.Notes = nil, nil
		}
		if !reflect.DeepEqual(got, want) {
			t.Errorf("got %+v\nexpected %+v", got, want)
		}
		if st, err := os.Stat(s.recordPath(want.Key)); err != nil || st.Mode() != 0o444 {
			t.Errorf("%v, %v", st, err)
		}
	}
}

// TestRecordFile holds the format of a record, so that it is not changed by
// accident: it must stay readable.
func TestRecordFile(t *testing.T) {
	got, err := encodeRecord(record("step Clean\ncode 12\n", "clean", HashOf([]byte("abc"))))
	if err != nil {
		t.Fatal(err)
	}
	const want = `rimlight record 1, sha256 of the rest: f02f90a6a43561804885ffc933477d435d00ff1a165e523937594ef42043be99
{
 "key": "c869fdd7d7ddc7e52ce28da6375fd58c7f93fd697c606d3b4f35a21fa4d84b24",
 "text": [
  "step Clean",
  "code 12",
  ""
 ],
 "results": [
  {
   "name": "clean",
   "type": "float64",
   "layout": "float64",
   "hash": "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad",
   "size": 5
  }
 ],
 "log": [
  "said <this> & that",
  "and more",
  ""
 ],
 "took": "1.5s",
 "when": "2031-05-17T12:00:00.000000042Z",
 "host": "dome",
 "program": "rimlight 1.0",
 "notes": [
  "slow"
 ]
}
`
	if string(got) != want {
		t.Errorf("got %s\nexpected %s", got, want)
	}
}

func TestRecordTexts(t *testing.T) {
	s := open(t)
	r := record("key", "depth", put(t, s, "depth")[0])
	r.Log = "bad \xff byte"
	if err := s.SetRecord(r); err != nil {
		t.Fatal(err)
	}
	if got, _, err := s.Record(r.Key); err != nil || got.Log != "bad \ufffd byte" {
		t.Errorf("%q, %v", got.Log, err)
	}
	bad := record("key \xff", "depth", r.Results[0].Hash)
	if err := s.SetRecord(bad); err == nil || !strings.Contains(err.Error(), "not valid UTF-8") {
		t.Errorf("a key text that is not UTF-8: %v", err)
	}
}

// TestRecordDamage damages a record in every way.
func TestRecordDamage(t *testing.T) {
	s := open(t)
	h := put(t, s, "depth")[0]
	r := record("key", "depth", h)
	good, err := encodeRecord(r)
	if err != nil {
		t.Fatal(err)
	}
	other, err := encodeRecord(record("other key", "depth", h))
	if err != nil {
		t.Fatal(err)
	}
	if err := s.SetRecord(r); err != nil {
		t.Fatal(err)
	}
	_, body, _ := bytes.Cut(good, []byte("\n"))
	reworded := func(from, to string) []byte { return withSum(bytes.Replace(body, []byte(from), []byte(to), 1)) }
	type flaw struct {
		data []byte
		want string
	}
	flaws := []flaw{
		{nil, "it begins with"}, {make([]byte, len(good)), "it begins with"}, {other, "it is the record of another computation"},
		{bytes.Replace(good, []byte("record 1"), []byte("record 2"), 1), `it begins with "rimlight record 2`},
		{reworded(`"key"`, `"kye"`), "its key is not"}, {reworded(`"key": "2`, `"key": "3`), "its key is not"},
		{reworded("dome", "dome\",\n \"moon\": \""), "not written as records are"}, {reworded("1.5s", "1500ms"), "not written as records are"},
		{reworded("1.5s", "soon"), "invalid duration"}, {reworded("2031-", "31-"), "cannot parse"}, {reworded("depth", "\xff"), "not written as records are"},
		{reworded(h.String(), h.Short()), "no SHA-256"}, {reworded(`"size": 5`, `"size": 5.5`), "cannot unmarshal"},
		{append(bytes.Clone(good), '\n'), "checksum"},
	}
	for i := range good {
		flipped := bytes.Clone(good)
		flipped[i] ^= 1 << (i % 8)
		flaws = append(flaws, flaw{flipped, ""}, flaw{good[:i], ""})
	}
	for _, f := range flaws {
		replace(t, s.recordPath(r.Key), f.data)
		got, ok, err := s.Record(r.Key)
		var bad *BadRecordError
		if ok || !errors.As(err, &bad) || bad.Path != s.recordPath(r.Key) || !strings.Contains(err.Error(), f.want) || !reflect.DeepEqual(got, Record{}) {
			t.Fatalf("%q: %+v, %v, %v; expected %s", f.data, got, ok, err, f.want)
		}
	}
	before := len(tree(t, s, "damaged"))
	if err := s.SetRecord(r); err != nil {
		t.Fatal(err)
	}
	if _, ok, err := s.Record(r.Key); !ok || err != nil {
		t.Errorf("after mending: %v, %v", ok, err)
	}
	if n := len(tree(t, s, "damaged")); n != before+1 {
		t.Errorf("%d files were set aside, expected 1", n-before)
	}
}

func TestNotReproducible(t *testing.T) {
	s := open(t)
	h := put(t, s, "first", "second", "third")
	first := record("key", "depth", h[0])
	if err := s.SetRecord(first); err != nil {
		t.Fatal(err)
	}
	same := first
	same.When, same.Host, same.Took = same.When.Add(-time.Hour), "barn", 1
	if err := s.SetRecord(same); err != nil {
		t.Errorf("the same results again, with the clock set back: %v", err)
	}
	for range 2 {
		for _, x := range h[1:] {
			err := s.SetRecord(record("key", "depth", x))
			var differs *NotReproducibleError
			if !errors.As(err, &differs) || differs.First != h[0] || differs.Second != x || differs.Name != "depth" || differs.Key != first.Key || differs.Replaced {
				t.Fatalf("other results: %v", err)
			}
			if b, err := os.ReadFile(differs.Beside); err != nil || !bytes.Contains(b, []byte(x.String())) {
				t.Errorf("the record beside: %s, %v", b, err)
			}
			for _, part := range []string{h[0].Short(), x.Short(), "the first one stays in force"} {
				if !strings.Contains(err.Error(), part) {
					t.Errorf("%q does not say %s", err, part)
				}
			}
		}
	}
	if got, ok, err := s.Record(first.Key); !ok || err != nil || got.Results[0].Hash != h[0] || got.Host != "dome" {
		t.Errorf("in force: %+v, %v, %v", got, ok, err)
	}
	if n := len(tree(t, s, "records")); n != 3 {
		t.Errorf("%d records, expected 3", n)
	}
	more := first
	more.Results = append(more.Results, Result{Name: "extra", Hash: h[0]})
	var differs *NotReproducibleError
	if err := s.SetRecord(more); !errors.As(err, &differs) || differs.Name != "extra" || differs.First != (Hash{}) || !strings.Contains(err.Error(), "was absent at first") {
		t.Errorf("more results: %v", err)
	}
	if hints, errs, err := s.Verify(nil); len(hints) != 3 || len(errs) != 0 || err != nil {
		t.Errorf("%v, %v, %v", hints, errs, err)
	}
}

// TestFirstLost checks that a record whose objects are lost does not stay in
// force, or its computation would be done again for ever.
func TestFirstLost(t *testing.T) {
	s := open(t)
	h := put(t, s, "first", "second")
	if err := s.SetRecord(record("key", "depth", h[0])); err != nil {
		t.Fatal(err)
	}
	if err := os.Remove(s.objectPath(h[0])); err != nil {
		t.Fatal(err)
	}
	var differs *NotReproducibleError
	if err := s.SetRecord(record("key", "depth", h[1])); !errors.As(err, &differs) || !differs.Replaced || differs.First != h[0] {
		t.Errorf("%v", err)
	}
	if got, ok, err := s.Record(KeyOf("key")); !ok || err != nil || got.Results[0].Hash != h[1] {
		t.Errorf("in force: %+v, %v, %v", got, ok, err)
	}
	if b, err := os.ReadFile(differs.Beside); err != nil || !bytes.Contains(b, []byte(h[0].String())) {
		t.Errorf("the record beside: %s, %v", b, err)
	}
}

func TestSetRecordRefuses(t *testing.T) {
	s := open(t)
	missing := record("key", "depth", HashOf([]byte("never put")))
	if err := s.SetRecord(missing); err == nil || !strings.Contains(err.Error(), "which is not in the store") {
		t.Errorf("a record of what is not there: %v", err)
	}
	wrong := record("key", "depth", put(t, s, "depth")[0])
	wrong.Text = "other"
	if err := s.SetRecord(wrong); err == nil || !strings.Contains(err.Error(), "has the key text of") {
		t.Errorf("a record with another text: %v", err)
	}
	if n := len(tree(t, s, "records")); n != 0 {
		t.Errorf("%d records", n)
	}
}

// TestWithoutLinks uses a file system that has no hard links.
func TestWithoutLinks(t *testing.T) {
	s := open(t)
	s.files.link = func(_, _ string) error { return &os.LinkError{Op: "link", Err: syscall.ENOTSUP} }
	h := put(t, s, "first", "second")
	if err := s.SetRecord(record("key", "depth", h[0])); err != nil {
		t.Fatal(err)
	}
	var differs *NotReproducibleError
	if err := s.SetRecord(record("key", "depth", h[1])); !errors.As(err, &differs) {
		t.Errorf("%v", err)
	}
	if got, _, err := s.Record(KeyOf("key")); err != nil || got.Results[0].Hash != h[0] {
		t.Errorf("in force: %+v, %v", got, err)
	}
	if n := len(tree(t, s, "tmp")); n != 0 {
		t.Errorf("%d temporary files are left", n)
	}
}

// TestSetAtOnce lets another process set the record just before this one.
func TestSetAtOnce(t *testing.T) {
	for _, other := range []string{"first", "second"} {
		s := open(t)
		h := put(t, s, "first", "second")
		theirs, err := encodeRecord(record("key", "depth", HashOf([]byte(other))))
		if err != nil {
			t.Fatal(err)
		}
		s.files.link = func(from, to string) error {
			if _, err := os.Stat(to); errors.Is(err, fs.ErrNotExist) {
				replace(t, to, theirs)
			}
			return os.Link(from, to)
		}
		err = s.SetRecord(record("key", "depth", h[0]))
		var differs *NotReproducibleError
		if other == "first" && err != nil || other == "second" && !errors.As(err, &differs) {
			t.Errorf("against %s: %v", other, err)
		}
		if got, err := os.ReadFile(s.recordPath(KeyOf("key"))); err != nil || !bytes.Equal(got, theirs) {
			t.Errorf("against %s: the record was overwritten (%v)", other, err)
		}
	}
}

func FuzzRecord(f *testing.F) {
	r := record("key", "depth", HashOf([]byte("abc")))
	good, err := encodeRecord(r)
	if err != nil {
		f.Fatal(err)
	}
	f.Add(good[bytes.IndexByte(good, '\n')+1:])
	f.Add([]byte("{}"))
	f.Fuzz(func(t *testing.T, body []byte) {
		if _, err := decodeRecord(r.Key, body); err == nil {
			t.Error("accepted without a checksum")
		}
		data := withSum(body)
		got, err := decodeRecord(r.Key, data)
		if err != nil {
			return
		}
		again, err := encodeRecord(got)
		if err != nil || !bytes.Equal(again, data) {
			t.Errorf("accepted %s, but written again as %s (%v)", data, again, err)
		}
		if got.Key != r.Key || KeyOf(got.Text) != r.Key {
			t.Error(fmt.Errorf("accepted the record of %s", got.Key))
		}
	})
}

// TestSetRecords holds that many records set at once are those that would have
// been set one by one, and that each fault stays with its own.
func TestSetRecords(t *testing.T) {
	s := open(t)
	a, errA := s.Put([]byte("a"))
	b, errB := s.Put([]byte("b"))
	if errA != nil || errB != nil {
		t.Fatal(errA, errB)
	}
	record := func(text string, h Hash) Record {
		return Record{Key: KeyOf(text), Text: text, Results: []Result{{Name: "x", Type: "t", Layout: "l", Hash: h, Size: 1}}}
	}
	if err := s.SetRecord(record("old", a)); err != nil {
		t.Fatal(err)
	}
	wrong := record("wrong", a)
	wrong.Text = "another"
	var batch []Record
	for i := range 20 {
		batch = append(batch, record(fmt.Sprint("new ", i), b))
	}
	batch = append(batch, record("old", a), record("old", b), wrong, record("missing", HashOf([]byte("nowhere"))))
	errs := s.SetRecords(batch)
	for i, err := range errs[:21] {
		if err != nil {
			t.Errorf("record %d: %v", i, err)
		}
	}
	var differs *NotReproducibleError
	if !errors.As(errs[21], &differs) {
		t.Errorf("other results for a known key gave %v", errs[21])
	}
	if errs[22] == nil || errs[23] == nil {
		t.Errorf("a wrong key gave %v, a missing object %v", errs[22], errs[23])
	}
	for i := range 20 {
		r, ok, err := s.Record(KeyOf(fmt.Sprint("new ", i)))
		if !ok || err != nil || r.Results[0].Hash != b {
			t.Errorf("record %d was read as %v, %v, %v", i, r, ok, err)
		}
	}
	if r, _, _ := s.Record(KeyOf("old")); r.Results[0].Hash != a {
		t.Error("the first results are no longer in force")
	}
	if left, _ := os.ReadDir(filepath.Join(s.dir, "tmp")); len(left) > 0 {
		t.Errorf("%d temporary files are left", len(left))
	}
}
