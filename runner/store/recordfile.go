package store

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"strings"
	"time"
	"unicode/utf8"
)

// recordMark begins the first line of a record's file, before the SHA-256 of
// everything after that line.
const recordMark = "rimlight record 1, sha256 of the rest: "

// recordFile is the JSON of a record. Texts are split at line ends, for people.
type recordFile struct {
	Key     Key      `json:"key"`
	Text    []string `json:"text"`
	Results []Result `json:"results"`
	Log     []string `json:"log"`
	Took    string   `json:"took"`
	When    string   `json:"when"`
	Host    string   `json:"host"`
	Program string   `json:"program"`
	Notes   []string `json:"notes"`
}

// encodeRecord gives the file of a record. Bytes of the log and the notes that
// are not valid UTF-8 are replaced; in other texts they are an error.
func encodeRecord(r Record) ([]byte, error) {
	f := recordFile{
		Key: r.Key, Text: strings.Split(r.Text, "\n"), Results: append([]Result{}, r.Results...), Log: strings.Split(valid(r.Log), "\n"),
		Took: r.Took.String(), When: r.When.UTC().Format(time.RFC3339Nano), Host: valid(r.Host), Program: r.Program, Notes: []string{},
	}
	for _, n := range r.Notes {
		f.Notes = append(f.Notes, valid(n))
	}
	texts := []string{r.Text, r.Program}
	for _, res := range r.Results {
		texts = append(texts, res.Name, res.Type, res.Layout)
	}
	for _, s := range texts {
		if !utf8.ValidString(s) {
			return nil, fmt.Errorf("%.60q is not valid UTF-8", s)
		}
	}
	var body bytes.Buffer
	e := json.NewEncoder(&body)
	e.SetEscapeHTML(false)
	e.SetIndent("", " ")
	if err := e.Encode(f); err != nil {
		return nil, err
	}
	return withSum(body.Bytes()), nil
}

func valid(s string) string { return strings.ToValidUTF8(s, "\ufffd") }

func withSum(body []byte) []byte {
	sum := sha256.Sum256(body)
	return append(fmt.Appendf(nil, "%s%s\n", recordMark, hex.EncodeToString(sum[:])), body...)
}

// decodeRecord reads the file of the record of a key. It accepts only what
// encodeRecord writes.
func decodeRecord(k Key, data []byte) (Record, error) {
	line, body, _ := bytes.Cut(data, []byte("\n"))
	if !bytes.HasPrefix(line, []byte(recordMark)) {
		return Record{}, fmt.Errorf("it begins with %.40q, expected %q", line, recordMark)
	}
	if !bytes.HasPrefix(withSum(body), append(line, '\n')) {
		return Record{}, errors.New("its checksum is wrong")
	}
	var f recordFile
	if err := json.Unmarshal(body, &f); err != nil {
		return Record{}, err
	}
	r := Record{
		Key: f.Key, Text: strings.Join(f.Text, "\n"), Results: f.Results, Log: strings.Join(f.Log, "\n"),
		Host: f.Host, Program: f.Program, Notes: f.Notes,
	}
	var err error
	if r.Took, err = time.ParseDuration(f.Took); err != nil {
		return Record{}, err
	}
	if r.When, err = time.Parse(time.RFC3339Nano, f.When); err != nil {
		return Record{}, err
	}
	r.When = r.When.UTC()
	if KeyOf(r.Text) != r.Key {
		return Record{}, errors.New("its key is not that of its text")
	}
	if r.Key != k {
		return Record{}, fmt.Errorf("it is the record of another computation, %s", r.Key.Short())
	}
	if again, err := encodeRecord(r); err != nil || !bytes.Equal(again, data) {
		return Record{}, errors.New("it is not written as records are")
	}
	return r, nil
}
