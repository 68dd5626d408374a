package reports

import (
	"bytes"
	"strings"
	"testing"
)

func TestAttachment(t *testing.T) {
	d := sample(3, 20)
	d.Source = append(d.Source, "\n\x00\xff\u202e</script><script id=\"rimlight-record\">{}</script>\r\n"...)
	page := render(t, d)
	a, err := ReadAttachment([]byte(page))
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(a.Recipe, d.Source) || a.File != d.File {
		t.Error("the recipe is not what it was")
	}
	if got := string(a.Record); !strings.Contains(got, `W\u00e4rme`) || strings.Contains(page, "Wärme") {
		t.Error(got)
	}
}

func TestAttachmentErrors(t *testing.T) {
	page := render(t, small())
	for want, damaged := range map[string]string{
		"carries no recipe":   "<html></html>",
		"is damaged":          strings.Replace(page, `{"format"`, `{format`, 1),
		`"rimlight report 1"`: strings.Replace(page, `"format":"rimlight report 1"`, `"format":"rimlight report 9"`, 1),
		"does not match":      strings.Replace(page, `"sha256":"`, `"sha256":"0`, 1),
	} {
		if _, err := ReadAttachment([]byte(damaged)); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("got %v, want %q", err, want)
		}
	}
}
