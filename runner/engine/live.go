package engine

import "rimlight/runner/store"

// Live gives the objects that a record holds on to: its results and, of lists,
// their elements. Objects that are missing or damaged are left out.
func Live(s *store.Store, r store.Record) []store.Hash {
	var out []store.Hash
	for _, res := range r.Results {
		out = append(out, res.Hash)
		if !isList(res.Layout) {
			continue
		}
		b, err := s.Get(res.Hash)
		if err != nil {
			continue
		}
		parts, err := parseList(b)
		if err != nil {
			continue
		}
		for _, p := range parts {
			out = append(out, p.hash)
		}
	}
	return out
}
