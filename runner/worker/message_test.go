package worker

import (
	"bytes"
	"encoding/binary"
	"io"
	"reflect"
	"runtime"
	"strings"
	"testing"
	"testing/iotest"
)

func TestMessageRoundTrip(t *testing.T) {
	for _, m := range []Message{
		{Kind: "answer", Head: []byte(`{"a":1}`)},
		{Kind: "call", Head: []byte{}, Blobs: [][]byte{[]byte("one"), {}, bytes.Repeat([]byte("x"), 20<<20)}},
	} {
		var b bytes.Buffer
		if err := m.Write(&b); err != nil {
			t.Fatal(err)
		}
		got, err := ReadMessage(iotest.OneByteReader(io.LimitReader(&b, 1<<16)), 1<<30)
		if len(m.Blobs) == 0 {
			if err != nil || !reflect.DeepEqual(got, m) {
				t.Errorf("got %v, %v; want %v", got, err, m)
			}
			continue
		}
		if err != io.ErrUnexpectedEOF {
			t.Errorf("a frame that is cut short: got error %v, want %v", err, io.ErrUnexpectedEOF)
		}
		b.Reset()
		m.Write(&b)
		if got, err = ReadMessage(&b, 1<<30); err != nil || !reflect.DeepEqual(got, m) {
			t.Errorf("large frame: error %v, equal %v", err, reflect.DeepEqual(got, m))
		}
		if _, err := ReadMessage(&b, 1<<30); err != io.EOF {
			t.Errorf("after the last frame: got error %v, want EOF", err)
		}
	}
}

func TestMessageLimits(t *testing.T) {
	frame := func(kind byte, head, blobs uint32, lengths ...uint64) []byte {
		b := []byte{kind}
		b = binary.BigEndian.AppendUint32(b, head)
		b = binary.BigEndian.AppendUint32(b, blobs)
		for _, n := range lengths {
			b = binary.BigEndian.AppendUint64(b, n)
		}
		return b
	}
	for name, c := range map[string]struct {
		bytes []byte
		want  string
	}{
		"long kind":      {frame(200, 0, 0), "malformed frame"},
		"huge head":      {frame(1, 1<<31, 0), "malformed frame"},
		"many blobs":     {frame(1, 0, 1<<31), "malformed frame"},
		"huge blob":      {append(frame(1, 0, 1, 1<<62), 'x'), "too large"},
		"sum over limit": {append(frame(1, 0, 2, 600, 600), bytes.Repeat([]byte("x"), 1000)...), "too large"},
		"claims only":    {append(frame(1, 0, 1, 1000), 'x'), "unexpected EOF"},
	} {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		_, err := ReadMessage(bytes.NewReader(c.bytes), 1000)
		runtime.ReadMemStats(&after)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: got error %v, want one with %q", name, err, c.want)
		}
		if n := after.TotalAlloc - before.TotalAlloc; n > 32<<20 {
			t.Errorf("%s: allocated %d bytes", name, n)
		}
	}
}

func FuzzReadMessage(f *testing.F) {
	var b bytes.Buffer
	Message{Kind: "call", Head: []byte(`{}`), Blobs: [][]byte{{1, 2, 3}}}.Write(&b)
	f.Add(b.Bytes())
	f.Add([]byte{1, 0, 0, 0, 0, 0, 0, 0, 0, 'x'})
	f.Fuzz(func(t *testing.T, data []byte) {
		r := bytes.NewReader(data)
		m, err := ReadMessage(r, 1<<20)
		if err != nil {
			return
		}
		var again bytes.Buffer
		if err := m.Write(&again); err != nil {
			t.Fatal(err)
		}
		if used := data[:len(data)-r.Len()]; !bytes.Equal(used, again.Bytes()) {
			t.Errorf("%x was read, but written as %x", used, again.Bytes())
		}
	})
}
