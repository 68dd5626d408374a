package store

import (
	"crypto/sha256"
	"hash"
	"io"
	"os"
)

// A Draft is an object in the making. What is written to it lies in memory
// while it is little, and then in a temporary file. [Store.PutDrafts] makes it
// an object; whoever changes their mind has to discard it. Until then, drafts
// leave nothing in the store but files in tmp/.
type Draft struct {
	store  *Store
	sum    hash.Hash
	hash   Hash
	done   bool // hash is that of the content, which is complete
	size   int64
	data   []byte
	file   *os.File // nil while all is in data
	staged bool     // the file is the caller's of stage
	err    error
}

// spill is the size in bytes from which a draft lies in a file.
const spill = 4 << 20

// NewDraft begins an empty object.
func (s *Store) NewDraft() *Draft { return &Draft{store: s, sum: sha256.New()} }

// Write adds to the object.
func (d *Draft) Write(p []byte) (int, error) {
	d.sum.Write(p)
	d.size += int64(len(p))
	d.data = append(d.data, p...)
	if d.size >= spill && d.err == nil && (d.file == nil || len(d.data) >= copySize) {
		d.err = d.flush()
	}
	return len(p), d.err
}

// flush moves what is in memory to the file.
func (d *Draft) flush() error {
	if err := d.store.room(d.size, int64(len(d.data))); err != nil {
		return err
	}
	if d.file == nil {
		f, err := d.store.temporary()
		if err != nil {
			return err
		}
		d.file = f
	}
	_, err := d.store.files.write(d.file, d.data)
	if cap(d.data) > 2*copySize {
		d.data = nil
	}
	d.data = d.data[:0]
	return d.store.explain(err)
}

// Size is how many bytes were written.
func (d *Draft) Size() int64 { return d.size }

// Held is how many bytes of memory the draft takes up, or its file is worth.
func (d *Draft) Held() int { return int(min(d.size, spill)) }

// Hash is the name of the object, which is complete now.
func (d *Draft) Hash() Hash {
	if !d.done {
		d.hash, d.done = Hash(d.sum.Sum(nil)), true
	}
	return d.hash
}

// Discard gives the object up.
func (d *Draft) Discard() {
	d.data = nil
	if d.file != nil {
		d.file.Close() // what matters was synced
		if !d.staged {
			os.Remove(d.file.Name()) // if that fails, a file remains in tmp, which does no harm
		}
		d.file = nil
	}
}

// stage gives the path of a temporary file that holds the object, which is from
// then on the caller's. Should it come to nothing, stage can be called again.
func (d *Draft) stage(sync bool) (path string, err error) {
	switch {
	case d.err != nil:
		return "", d.err
	case d.file == nil:
		return d.store.stage(d.data, 0o444, sync)
	case len(d.data) > 0:
		if d.err = d.flush(); d.err != nil {
			return "", d.err
		}
	}
	if d.staged {
		return d.again(sync)
	}
	if err := d.store.seal(d.file, d.size, 0o444, sync); err != nil {
		return "", d.store.explain(err)
	}
	d.staged = true
	return d.file.Name(), nil
}

// again stages the object a second time, from the file that was staged first
// and may have been deleted since.
func (d *Draft) again(sync bool) (path string, err error) {
	f, err := d.store.temporary()
	if err != nil {
		return "", err
	}
	_, err = io.Copy(f, io.NewSectionReader(d.file, 0, d.size))
	return d.store.finish(f, err, d.size, 0o444, sync)
}
