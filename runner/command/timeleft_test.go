package command

import (
	"testing"
	"time"

	"rimlight/runner/engine"
)

// TestTimeLeft holds that what was known from before does not make the rest
// look quick.
func TestTimeLeft(t *testing.T) {
	began := time.Date(2030, 1, 1, 0, 0, 0, 0, time.UTC)
	now := began
	d := &display{paces: map[string]pace{}, now: func() time.Time { return now }}
	for _, c := range []struct {
		after time.Duration
		done  int
		want  string
	}{
		{0, 900, ""},
		{time.Second, 901, ""},
		{2 * time.Second, 902, "about 2 min left"},
		{10 * time.Second, 910, "about 2 min left"},
		{2 * time.Minute, 910, "about 19 min left"},
		{90 * time.Second, 990, "about 11 s left"},
		{10 * time.Hour, 902, "about 491 h left"},
		{time.Minute, 1000, ""},
	} {
		now = began.Add(c.after)
		if got := leftText(d.left(engine.Event{Step: "Fit", Done: c.done, Total: 1000})); got != c.want {
			t.Errorf("%d of 1000 after %v: %q, expected %q", c.done, c.after, got, c.want)
		}
	}
}
