package engine

import (
	"rimlight/runner/store"
	"rimlight/runner/worker"
)

// Live gives the objects that a record holds on to: its results and, of lists,
// their elements. What is missing or damaged holds on to nothing; a list that
// cannot be read for another reason is an error.
func Live(s *store.Store, r store.Record) (out []store.Hash, err error) {
	for _, res := range r.Results {
		out = append(out, res.Hash)
		if !worker.IsList(res.Layout) {
			continue
		}
		b, err := s.Get(res.Hash)
		if damaged(err) {
			continue
		}
		if err != nil {
			return nil, err
		}
		parts, err := parseList(b)
		if err != nil {
			continue
		}
		for _, p := range parts {
			out = append(out, p.hash)
		}
	}
	return out, nil
}
