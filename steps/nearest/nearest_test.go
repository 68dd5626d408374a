package nearest

import (
	"strings"
	"testing"
)

func TestName(t *testing.T) {
	known := []string{"TIME", "FLUX", "FLUX_ERR", "X", ""}
	for _, c := range []struct{ name, want string }{
		{"TIMES", "TIME"},
		{"flux", "FLUX"},
		{"FLUXERR", "FLUX_ERR"},
		{"FLUX_ERROR", "FLUX_ERR"},
		{"Y", "X"},
		{"AIRMASS", ""},
		{strings.Repeat("T", 1000), ""},
	} {
		if got := Name(c.name, known); got != c.want {
			t.Errorf("Name(%q) = %q, want %q", c.name, got, c.want)
		}
	}
	if got, want := Hint("TIMES", known), "; nearest known name: TIME"; got != want {
		t.Errorf("Hint = %q, want %q", got, want)
	}
}
