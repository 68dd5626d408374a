package engine

import "context"

// Parts reads result number result of a step for showing: a list element by
// element, so that it need not be held as a whole, any other value as one
// part. When something turns out to be damaged it is computed again, and the
// parts are handed over from the first. An error of each ends it.
func (e *Engine) Parts(ctx context.Context, step, result int, each func(i int, sealed []byte) error) error {
	for attempt := 0; ; attempt++ {
		err := e.parts(e.result(step, result), each)
		if !damaged(err) || attempt > 0 {
			return err
		}
		if err := e.mend(ctx, step, err); err != nil {
			return err
		}
	}
}

func (e *Engine) parts(v Value, each func(i int, sealed []byte) error) error {
	items := []Value{v}
	if v.Len() >= 0 {
		var err error
		if items, err = elements(e.Store, v); err != nil {
			return err
		}
	}
	var flaws []error // all of them, so that they are mended together
	for i, item := range items {
		b, err := sealed(e.Store, item)
		switch {
		case damaged(err):
			flaws = append(flaws, err)
		case err != nil:
			return err
		case len(flaws) == 0:
			err = each(i, b)
		}
		if err != nil && len(flaws) == 0 {
			return err
		}
	}
	if len(flaws) > 0 {
		return damages(flaws)
	}
	return nil
}
