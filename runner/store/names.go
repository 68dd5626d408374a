package store

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"path/filepath"
)

// A Hash names an object: the SHA-256 of its bytes.
type Hash [32]byte

// A Key names a computation: the SHA-256 of its key text.
type Key [32]byte

// HashOf is the name of an object.
func HashOf(data []byte) Hash { return sha256.Sum256(data) }

// KeyOf is the name of the computation with the given key text.
func KeyOf(text string) Key { return sha256.Sum256([]byte(text)) }

// String gives 64 hexadecimal digits.
func (h Hash) String() string { return hex.EncodeToString(h[:]) }

// String gives 64 hexadecimal digits.
func (k Key) String() string { return hex.EncodeToString(k[:]) }

// Short gives the first 12 hexadecimal digits, for people.
func (h Hash) Short() string { return h.String()[:12] }

// Short gives the first 12 hexadecimal digits, for people.
func (k Key) Short() string { return k.String()[:12] }

// ParseHash reads 64 lower-case hexadecimal digits.
func ParseHash(s string) (Hash, error) {
	b, err := parseName(s)
	return b, err
}

// ParseKey reads 64 lower-case hexadecimal digits.
func ParseKey(s string) (Key, error) {
	b, err := parseName(s)
	return b, err
}

func parseName(s string) (out [32]byte, err error) {
	if n, err := hex.Decode(out[:], []byte(s[:min(len(s), 64)])); err != nil || n != len(out) || hex.EncodeToString(out[:]) != s {
		return [32]byte{}, fmt.Errorf("%.80q is no SHA-256; expected 64 hexadecimal digits in lower case", s)
	}
	return out, nil
}

// MarshalText gives 64 hexadecimal digits.
func (h Hash) MarshalText() ([]byte, error) { return []byte(h.String()), nil }

// UnmarshalText reads 64 lower-case hexadecimal digits.
func (h *Hash) UnmarshalText(b []byte) (err error) {
	*h, err = ParseHash(string(b))
	return err
}

// MarshalText gives 64 hexadecimal digits.
func (k Key) MarshalText() ([]byte, error) { return []byte(k.String()), nil }

// UnmarshalText reads 64 lower-case hexadecimal digits.
func (k *Key) UnmarshalText(b []byte) (err error) {
	*k, err = ParseKey(string(b))
	return err
}

// The path of an object or record: a folder for each first byte of a name
// keeps folders small.
func (s *Store) objectPath(h Hash) string { return s.path("objects", h.String()) }
func (s *Store) recordPath(k Key) string  { return s.path("records", k.String()) }

func (s *Store) path(kind, name string) string {
	return filepath.Join(s.dir, kind, name[:2], name)
}
