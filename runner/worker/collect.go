package worker

import (
	"runtime"
	"runtime/debug"
	"runtime/metrics"
)

// Garbage that may lie about: as much as there is of live memory, as Go has it
// by default, but no more than this, or leastGarbage percent of mass data.
// Collecting more often costs little where the memory is mass data, since
// numbers are not looked at.
const (
	mostGarbage  = 64 << 20
	leastGarbage = 10
)

// tuneCollector has the garbage collector's pace set anew after each
// collection.
func tuneCollector() {
	live := []metrics.Sample{{Name: "/gc/heap/live:bytes"}}
	now := 100
	var again func(*[16]byte)
	again = func(*[16]byte) {
		metrics.Read(live)
		if live[0].Value.Kind() == metrics.KindUint64 {
			percent := int(min(100, max(leastGarbage, mostGarbage*100/max(1, live[0].Value.Uint64()))))
			if percent != now {
				debug.SetGCPercent(percent)
				now = percent
			}
		}
		runtime.SetFinalizer(new([16]byte), again)
	}
	again(nil)
}
