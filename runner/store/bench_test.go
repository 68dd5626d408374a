package store

import (
	"fmt"
	"testing"
)

func BenchmarkPut(b *testing.B) {
	s := open(b)
	i := 0
	for b.Loop() {
		i++
		put(b, s, fmt.Sprint(i))
	}
}

// BenchmarkPutBatch puts 400 objects at a time.
func BenchmarkPutBatch(b *testing.B) {
	s := open(b)
	i := 0
	for b.Loop() {
		data := make([][]byte, 400)
		for k := range data {
			i++
			data[k] = fmt.Append(nil, i)
		}
		if _, err := s.PutBatch(data); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(b.Elapsed().Microseconds())/float64(i), "µs/object")
}

func BenchmarkPutPresent(b *testing.B) {
	s := open(b)
	put(b, s, "depth")
	for b.Loop() {
		put(b, s, "depth")
	}
}

func BenchmarkSetRecord(b *testing.B) {
	s := open(b)
	h := put(b, s, "depth")[0]
	i := 0
	for b.Loop() {
		i++
		if err := s.SetRecord(record(fmt.Sprint(i), "depth", h)); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkRecord(b *testing.B) {
	s := open(b)
	r := record("key", "depth", put(b, s, "depth")[0])
	if err := s.SetRecord(r); err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if _, ok, err := s.Record(r.Key); !ok || err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkGet(b *testing.B) {
	s := open(b)
	data := make([]byte, 4<<20)
	h, err := s.Put(data)
	if err != nil {
		b.Fatal(err)
	}
	b.SetBytes(int64(len(data)))
	for b.Loop() {
		if _, err := s.Get(h); err != nil {
			b.Fatal(err)
		}
	}
}
