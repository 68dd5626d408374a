package canon

import "unicode/utf8"

const (
	envelopeName    = "rimlight value"
	envelopeVersion = 1
	selfDescribed   = 55799 // the tag that marks data as CBOR (RFC 8949, section 3.4.6)
)

// Seal puts a value's canonical bytes into an envelope with the name of its
// type, for people, and its layout (see [Layout]), for readers to compare with
// what they expect. The envelope is itself CBOR, an array
//
//	55799(["rimlight value", 1, TYPE, LAYOUT, VALUE])
//
// whose second element is the version of this format.
func Seal(typ, layout string, value []byte) []byte {
	if !utf8.ValidString(typ) || !utf8.ValidString(layout) {
		panic("canon: type or layout is not valid UTF-8")
	}
	dst := make([]byte, 0, 48+len(typ)+len(layout)+len(value))
	dst = appendHead(dst, majorTag, selfDescribed)
	dst = appendHead(dst, majorArray, 5)
	dst = appendText(dst, envelopeName)
	dst = appendHead(dst, majorNatural, envelopeVersion)
	dst = appendText(dst, typ)
	dst = appendText(dst, layout)
	return append(dst, value...)
}

// Open takes a value out of its envelope. The value is a part of data, and has
// yet to be decoded: [Unmarshal], [Split] and [Tree] check it. An envelope of
// another version is refused.
func Open(data []byte) (typ, layout string, value []byte, err error) {
	r := reader{data: data}
	if typ, layout, err = r.envelope(); err != nil {
		return "", "", nil, err
	}
	return typ, layout, r.data, nil
}

// envelope takes off everything of an envelope that comes before the value.
func (r *reader) envelope() (typ, layout string, err error) {
	r.fill()
	for _, want := range []struct {
		major byte
		arg   uint64
	}{{majorTag, selfDescribed}, {majorArray, 5}} {
		if major, arg, err := r.head(); err != nil || major != want.major || arg != want.arg {
			return "", "", errorf("the bytes are no value of rimlight's")
		}
	}
	if name, err := r.text("a name"); err != nil || string(name) != envelopeName {
		return "", "", errorf("the bytes are no value of rimlight's")
	}
	version, err := r.expect(majorNatural, "a version")
	if err != nil {
		return "", "", within("envelope", err)
	}
	if version != envelopeVersion {
		return "", "", errorf("the value's envelope has version %d, but this program knows version %d only", version, envelopeVersion)
	}
	for _, part := range []*string{&typ, &layout} {
		r.fill()
		b, err := r.text("the name or layout of a type")
		if err != nil {
			return "", "", within("envelope", err)
		}
		*part = string(b)
	}
	if r.fill(); len(r.data) == 0 {
		return "", "", errorf("the envelope holds no value")
	}
	return typ, layout, nil
}
