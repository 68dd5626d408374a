package reports

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"html/template"
	"regexp"
	"unicode/utf16"
	"unicode/utf8"
)

// attachmentFormat marks what a report carries for programs. Another mark is
// not guessed at.
const attachmentFormat = "rimlight report 1"

// An Attachment is what a report carries for programs: the recipe, byte for
// byte, and the run's record.
type Attachment struct {
	Format string          `json:"format"`
	File   string          `json:"file"`   // the recipe's file name
	Recipe []byte          `json:"recipe"` // base64 in the report
	SHA256 string          `json:"sha256"` // of the recipe, hex
	Record json.RawMessage `json:"record"` // null when the report has none
}

// attach encodes a document's attachment as JSON that holds nothing but
// printable ASCII without "<", ">" and "&", so that it survives in a page.
func attach(d Document) template.JS {
	sum := sha256.Sum256(d.Source)
	a := Attachment{Format: attachmentFormat, File: label(d.File), Recipe: d.Source, SHA256: hex.EncodeToString(sum[:])}
	if json.Valid(d.Record) {
		a.Record = d.Record
	}
	b, err := json.Marshal(a)
	if err != nil { // cannot be: the record is valid, all else are texts
		return "null"
	}
	return template.JS(ascii(b))
}

// ascii escapes the characters of a JSON text that are not printable ASCII.
// Outside strings a JSON text has no others.
func ascii(b []byte) []byte {
	var out bytes.Buffer
	for len(b) > 0 {
		r, n := utf8.DecodeRune(b)
		b = b[n:]
		switch {
		case r >= 0x20 && r < 0x7f:
			out.WriteByte(byte(r))
		case r >= 0x10000:
			hi, lo := utf16.EncodeRune(r)
			fmt.Fprintf(&out, `\u%04x\u%04x`, hi, lo)
		default:
			fmt.Fprintf(&out, `\u%04x`, r)
		}
	}
	return out.Bytes()
}

var attachment = regexp.MustCompile(`(?s)<script[^>]*\bid="rimlight-record"[^>]*>(.*?)</script>`)

// ReadAttachment takes the recipe and the record out of a report. Nothing that
// is shown in a report can pass for its attachment: shown text is escaped. The
// recipe is checked against its hash.
func ReadAttachment(report []byte) (Attachment, error) {
	m := attachment.FindSubmatch(report)
	if m == nil {
		return Attachment{}, errors.New("this file carries no recipe: it is no report, or something rewrote it")
	}
	var a Attachment
	if err := json.Unmarshal(m[1], &a); err != nil {
		return Attachment{}, fmt.Errorf("what the report carries for programs is damaged: %w", err)
	}
	if a.Format != attachmentFormat {
		return Attachment{}, fmt.Errorf("the report's format is %q, expected %q", a.Format, attachmentFormat)
	}
	if sum := sha256.Sum256(a.Recipe); hex.EncodeToString(sum[:]) != a.SHA256 {
		return Attachment{}, errors.New("the recipe in the report does not match its hash: the file is damaged or was changed")
	}
	return a, nil
}
