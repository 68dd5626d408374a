package engine

import (
	"bytes"
	"context"
	"io"

	"rimlight/runner/plan"
)

// A Part is a kept value to be shown, or one element of a list: its envelope,
// to be read once, as little of it as one likes.
type Part struct {
	Type   string
	Layout string
	Size   int64 // bytes in the envelope
	io.Reader
}

// Parts reads result number result of a step for showing: a list element by
// element, any other value as one part. When something turns out to be damaged
// it is computed again, and the parts are handed over from the first; damage is
// found also where each does not look. An error of each ends it.
func (e *Engine) Parts(ctx context.Context, step, result int, each func(i int, p Part) error) error {
	return e.allParts(ctx, plan.Arg{Source: plan.FromResult, Step: step, Result: result}, each)
}

// InputParts reads an input as read, likewise.
func (e *Engine) InputParts(ctx context.Context, input int, each func(i int, p Part) error) error {
	return e.allParts(ctx, plan.Arg{Source: plan.FromInput, Input: input}, each)
}

func (e *Engine) allParts(ctx context.Context, a plan.Arg, each func(i int, p Part) error) error {
	for attempt := 0; ; attempt++ {
		err := e.parts(e.argument(a), each)
		if !damaged(err) || attempt > 0 {
			return err
		}
		if err := e.mendArgument(ctx, a, err); err != nil {
			return err
		}
	}
}

func (e *Engine) parts(v Value, each func(i int, p Part) error) error {
	items := []Value{v}
	if v.Len() >= 0 {
		var err error
		if items, err = elements(e.Store, v); err != nil {
			return err
		}
	}
	var flaws []error // all of them, so that they are mended together
	for i, item := range items {
		var err error
		if len(flaws) > 0 {
			err = item.write(io.Discard, e.Store)
		} else {
			err = e.part(item, func(p Part) error { return each(i, p) })
		}
		switch {
		case damaged(err):
			flaws = append(flaws, err)
		case err != nil:
			return err
		}
	}
	if len(flaws) > 0 {
		return damages(flaws)
	}
	return nil
}

// part hands over one value. What is large is read as it is looked at, and what
// is small before.
func (e *Engine) part(v Value, do func(p Part) error) error {
	const small = 1 << 20
	p := Part{Type: v.Type, Layout: v.Layout, Size: v.sealedSize()}
	if v.Size <= small {
		b, err := sealed(e.Store, v)
		if err != nil {
			return err
		}
		p.Reader = bytes.NewReader(b)
		return do(p)
	}
	r, w := io.Pipe()
	defer r.Close()
	go func() { w.CloseWithError(v.write(w, e.Store)) }()
	p.Reader = r
	err := do(p)
	if _, e := io.Copy(io.Discard, r); e != nil { // it may be why do failed
		err = e
	}
	return err
}
