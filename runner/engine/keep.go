package engine

import (
	"errors"
	"fmt"
	"sync"
	"time"

	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// A keeping is what a computation gave and the store does not yet have.
type keeping struct {
	c       *Computation
	name    string   // of the step or input
	results []string // names of the results
	values  worker.Values
	tray    *tray
	done    func(error) // told when it is kept, or why it could not be
}

// Limits on what is kept in one go: much for few waits on the disk, little for
// little to lose.
const (
	maxTogether      = 64
	maxTogetherBytes = 64 << 20
)

// keeper keeps what arrives, as much at a time as has come up meanwhile, until
// the channel is closed.
func (e *Engine) keeper(arriving <-chan keeping) {
	for k := range arriving {
		batch := []keeping{k}
	more:
		for len(batch) < maxTogether {
			select {
			case k, ok := <-arriving:
				if !ok {
					break more
				}
				batch = append(batch, k)
			default:
				break more
			}
		}
		e.keep(batch)
	}
}

// A waiting counts the bytes in memory that wait to be kept.
type waiting struct {
	mu    sync.Mutex
	less  *sync.Cond
	bytes int
}

func newWaiting() *waiting {
	w := &waiting{}
	w.less = sync.NewCond(&w.mu)
	return w
}

// add waits until there is room for n bytes more.
func (w *waiting) add(n int) {
	w.mu.Lock()
	defer w.mu.Unlock()
	for w.bytes > 0 && w.bytes+n > maxTogetherBytes {
		w.less.Wait()
	}
	w.bytes += n
}

// done says that n bytes were kept.
func (w *waiting) done(n int) {
	w.mu.Lock()
	defer w.mu.Unlock()
	w.bytes -= n
	w.less.Broadcast()
}

// keep stores what computations gave, all results first, all records last, and
// tells each how it went.
func (e *Engine) keep(batch []keeping) {
	when := time.Now().UTC()
	var drafts []*store.Draft
	var records []store.Record
	var good []keeping
	for _, k := range batch {
		values, err := k.arrange()
		if err != nil {
			k.tray.clear()
			k.done(err)
			continue
		}
		r := store.Record{Key: k.c.Text.Key(), Text: string(k.c.Text), Log: k.values.Log, Took: k.values.Took, When: when, Host: e.Host, Program: e.Build.Version, Notes: k.values.Notes}
		for i, v := range values {
			r.Results = append(r.Results, store.Result{Name: k.results[i], Type: v.Type, Layout: v.Layout, Hash: v.Hash, Size: v.Size})
		}
		k.c.Results = values
		drafts, records, good = append(drafts, k.tray.drafts...), append(records, r), append(good, k)
		k.tray.drafts = nil
	}
	if err := e.Store.PutDrafts(drafts); err != nil {
		for _, k := range good {
			k.done(err)
		}
		return
	}
	for i, err := range e.Store.SetRecords(records) {
		k := good[i]
		var differs *store.NotReproducibleError
		if errors.As(err, &differs) {
			e.note("%s: %v", k.name, err)
			e.differ(k.name)
			err = e.firstInForce(k.c, records[i].Key)
		}
		if err == nil {
			k.c.State, k.c.Log, k.c.Took, k.c.When, k.c.Host = Computed, k.values.Log, k.values.Took, when, e.Host
		}
		k.done(err)
	}
}

func (e *Engine) differ(name string) {
	e.watch.Lock()
	defer e.watch.Unlock()
	if len(e.differs) == 0 || e.differs[len(e.differs)-1] != name {
		e.differs = append(e.differs, name)
	}
}

// keepOne is keep for a single computation, waiting for it.
func (e *Engine) keepOne(k keeping) error {
	var err error
	k.done = func(e error) { err = e }
	e.keep([]keeping{k})
	return err
}

func (k keeping) arrange() ([]Value, error) {
	if len(k.values.Results) != len(k.results) {
		return nil, fmt.Errorf("the worker gave %d results, expected %d", len(k.values.Results), len(k.results))
	}
	return k.tray.values(k.values.Results)
}

// firstInForce takes up the results that a computation gave the first time, in
// place of the different ones that it gave now.
func (e *Engine) firstInForce(c *Computation, key store.Key) error {
	first, ok, _ := e.Store.Record(key)
	if !ok || len(first.Results) != len(c.Results) {
		return nil // they are gone
	}
	for i, res := range first.Results {
		var err error
		if c.Results[i], err = known(e.Store, res); err != nil {
			return err
		}
	}
	return nil
}
