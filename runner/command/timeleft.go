package command

import (
	"fmt"
	"time"

	"rimlight/runner/engine"
)

// A pace is how quickly the elements of a fan-out get done. Elements that were
// known when it began took no time, and do not count.
type pace struct {
	began time.Time
	known int // elements that were there
}

// leastSeen is how many elements have to be done before anything is said about
// the rest.
const leastSeen = 2

// left is how long the rest will take if it goes on as it did; false when too
// little is known.
func (p pace) left(ev engine.Event, now time.Time) (time.Duration, bool) {
	done := ev.Done - p.known
	if done < leastSeen || ev.Done >= ev.Total {
		return 0, false
	}
	each := float64(now.Sub(p.began)) / float64(done)
	return time.Duration(each * float64(ev.Total-ev.Done)), true
}

// left is how long the rest of a fan-out will take, which is seen from its
// first event on.
func (d *display) left(ev engine.Event) (time.Duration, bool) {
	p, ok := d.paces[ev.Step]
	if !ok {
		p = pace{d.now(), ev.Done}
		d.paces[ev.Step] = p
	}
	return p.left(ev, d.now())
}

// leftText says it in words, with as many digits as can be meant.
func leftText(left time.Duration, ok bool) string {
	switch {
	case !ok:
		return ""
	case left < time.Minute:
		return fmt.Sprintf("about %d s left", int(left.Seconds())+1)
	case left < 2*time.Hour:
		return fmt.Sprintf("about %d min left", int(left.Minutes())+1)
	}
	return fmt.Sprintf("about %d h left", int(left.Hours())+1)
}
