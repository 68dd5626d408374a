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
		{Kind: "more", Head: []byte{}, Body: bytes.Repeat([]byte("x"), maxBody)},
		{Kind: "load", Head: bytes.Repeat([]byte("x"), 3<<20), Body: []byte("one")},
	} {
		var b bytes.Buffer
		if err := m.Write(&b); err != nil {
			t.Fatal(err)
		}
		whole := b.Bytes()
		if _, err := ReadMessage(bytes.NewReader(whole[:len(whole)-1])); err != io.ErrUnexpectedEOF {
			t.Errorf("a frame that is cut short: got error %v, want %v", err, io.ErrUnexpectedEOF)
		}
		if got, err := ReadMessage(iotest.HalfReader(&b)); err != nil || !reflect.DeepEqual(got, m) {
			t.Errorf("error %v, equal %v", err, reflect.DeepEqual(got, m))
		}
		if _, err := ReadMessage(&b); err != io.EOF {
			t.Errorf("after the last frame: got error %v, want EOF", err)
		}
	}
}

func TestMessageLimits(t *testing.T) {
	frame := func(kind byte, head, body uint32) []byte {
		b := []byte{kind}
		b = binary.BigEndian.AppendUint32(b, head)
		return binary.BigEndian.AppendUint32(b, body)
	}
	for name, c := range map[string]struct {
		bytes []byte
		want  string
	}{
		"long kind":   {frame(200, 0, 0), "malformed frame"},
		"huge head":   {frame(1, 1<<31, 0), "malformed frame"},
		"huge body":   {frame(1, 0, 1<<31), "malformed frame"},
		"claims only": {append(frame(1, maxHead, maxBody), 'x'), "unexpected EOF"},
	} {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		_, err := ReadMessage(bytes.NewReader(c.bytes))
		runtime.ReadMemStats(&after)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: got error %v, want one with %q", name, err, c.want)
		}
		if n := after.TotalAlloc - before.TotalAlloc; n > 4<<20 {
			t.Errorf("%s: allocated %d bytes", name, n)
		}
	}
}

func FuzzReadMessage(f *testing.F) {
	var b bytes.Buffer
	Message{Kind: "call", Head: []byte(`{}`), Body: []byte{1, 2, 3}}.Write(&b)
	f.Add(b.Bytes())
	f.Add([]byte{1, 0, 0, 0, 0, 0, 0, 0, 0, 'x'})
	f.Fuzz(func(t *testing.T, data []byte) {
		r := bytes.NewReader(data)
		m, err := ReadMessage(r)
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
