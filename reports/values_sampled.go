package reports

import (
	"fmt"

	"rimlight/steps/chain"
	"rimlight/steps/fit"
)

// sampled shows a posterior that draws were taken from: the fit with the errors
// of the draws, what the draws say of each parameter, and whether they can be
// trusted.
func (b *builder) sampled(title string, s fit.Sampled) []block {
	if len(s.Draws.X) == 0 {
		return []block{{Text: "no draws were taken"}}
	}
	blocks := []block{
		{Posterior: b.posterior(s.Posterior)},
		{Grid: b.numbered(b.grid(chain.Table("Draws from the posterior", s.Summary[:min(len(s.Summary), shownParameters)]), title))},
	}
	facts := []fact{{"draws", fmt.Sprintf("%s in %s", grouped(s.Draws.Chains*s.Draws.Length), count(s.Draws.Chains, "chain"))}}
	if e := s.Evidence; e.Iterations > 0 {
		facts = append(facts, fact{"log evidence", measured(e.LogZ, e.Err)})
	}
	blocks = append(blocks, block{Facts: facts})
	if len(s.Checks) > 0 {
		verdicts := make([]verdict, 0, len(s.Checks))
		for _, c := range s.Checks {
			verdicts = append(verdicts, verdict{c, ""})
		}
		blocks = append(blocks, block{Verdicts: verdictViews(verdicts)})
	}
	return blocks
}
