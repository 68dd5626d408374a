package worker

import (
	"runtime"
	"runtime/debug"
	"runtime/metrics"
)

// Garbage that may lie about: four times what there is of live memory, but no
// more than this, or leastGarbage percent of mass data. Most of what is live in
// a worker at work on little data is the interpreter's, and looking at it took
// a sixth of the processor time of the shipped recipe. Collecting more often
// costs little where the memory is mass data, since numbers are not looked at.
const (
	mostGarbage  = 64 << 20 // and no more than garbageShare of the memory that the worker may have
	garbageShare = 8        // one in so many
	mostPercent  = 400
	leastGarbage = 10
)

// TuneCollector has the garbage collector's pace set anew after each
// collection, in a process that may have so many bytes of memory: a worker, or
// the program that starts them. It is for the start of a process.
func TuneCollector(memory int64) {
	live := []metrics.Sample{{Name: "/gc/heap/live:bytes"}}
	most := uint64(min(mostGarbage, memory/garbageShare))
	now := int(min(mostPercent, most*100/(4<<20))) // nothing is live yet; Go then counts as if 4 MiB were
	debug.SetGCPercent(now)
	var again func(*[16]byte)
	again = func(*[16]byte) {
		metrics.Read(live)
		if live[0].Value.Kind() == metrics.KindUint64 {
			percent := int(min(mostPercent, max(leastGarbage, most*100/max(1, live[0].Value.Uint64()))))
			if percent != now {
				debug.SetGCPercent(percent)
				now = percent
			}
		}
		runtime.SetFinalizer(new([16]byte), again)
	}
	again(nil)
}
