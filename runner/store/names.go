package store

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
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

// Short gives the first 12 hexadecimal digits, for people.
func (h Hash) Short() string { return h.String()[:12] }

// String gives 64 hexadecimal digits.
func (k Key) String() string { return hex.EncodeToString(k[:]) }

// ParseHash reads 64 lower-case hexadecimal digits.
func ParseHash(s string) (Hash, error) {
	b, err := parse(s)
	return Hash(b), err
}

// ParseKey reads 64 lower-case hexadecimal digits.
func ParseKey(s string) (Key, error) {
	b, err := parse(s)
	return Key(b), err
}

func parse(s string) (out [32]byte, err error) {
	b, err := hex.DecodeString(s)
	if err != nil || len(b) != len(out) || hex.EncodeToString(b) != s {
		return out, fmt.Errorf("%.80q is not a hash; expected 64 lower-case hexadecimal digits", s)
	}
	copy(out[:], b)
	return out, nil
}

// MarshalText and UnmarshalText make hashes readable in JSON.
func (h Hash) MarshalText() ([]byte, error) { return []byte(h.String()), nil }

// UnmarshalText reads what MarshalText wrote.
func (h *Hash) UnmarshalText(b []byte) (err error) {
	*h, err = ParseHash(string(b))
	return err
}

// MarshalText makes keys readable in JSON.
func (k Key) MarshalText() ([]byte, error) { return []byte(k.String()), nil }

// UnmarshalText reads what MarshalText wrote.
func (k *Key) UnmarshalText(b []byte) (err error) {
	*k, err = ParseKey(string(b))
	return err
}
