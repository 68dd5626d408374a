package fit

import (
	"fmt"
	"strings"

	"rimlight/steps/lightcurve"
)

// limbRows settles how limb darkening is treated in the fit of one curve: it
// returns the priors table with its rows on limb darkening taken, dropped or
// replaced by others, and what to warn of.
//
// The law decides which coefficients exist. In a white fit (byTable false) the
// rows count whatever the policy, which speaks of channels, and the policy only
// fills in where there are none. In a channel fit the policy decides: rows count
// where it is "free".
func limbRows(priors Priors, setup Setup, channel lightcurve.Channel, byTable bool) (Priors, []string, error) {
	var rest, rows Priors
	var warnings []string
	for _, p := range priors {
		switch p.Name {
		case "u1", "u2", "q1", "q2":
			rows = append(rows, p)
		default:
			rest = append(rest, p)
		}
	}
	switch setup.LimbLaw {
	case LawUniform:
		if len(rows) > 0 {
			warnings = append(warnings, "priors on limb darkening are not used: the law is uniform")
		}
		return append(rest, held("u1", 0), held("u2", 0)), warnings, nil
	case LawLinear:
		kept := rows[:0]
		for _, p := range rows {
			switch p.Name {
			case "u1":
				kept = append(kept, p)
			case "u2":
				warnings = append(warnings, "the prior on u2 is not used: the law is linear")
			default:
				return nil, nil, fmt.Errorf("%s belongs to a law of two coefficients, but the law is linear; give a prior for u1", p.Name)
			}
		}
		rows = append(kept, held("u2", 0))
	}
	named := false
	for _, p := range rows {
		named = named || p.Name != "u2" || p.Kind != Fixed
	}
	if setup.LimbPolicy == PolicyFree || !byTable && named {
		if !named {
			return nil, nil, fmt.Errorf("the limb-darkening policy is free, but the priors table has no rows for it; add u1 and u2 (for example U(-1, 2)), or q1 and q2 (for example U(0, 1))")
		}
		return append(rest, rows...), warnings, nil
	}
	fromTable, err := tableRows(setup, channel)
	if err != nil {
		return nil, nil, err
	}
	return append(rest, fromTable...), warnings, nil
}

func held(name string, value float64) Prior { return Prior{Name: name, Kind: Fixed, A: value} }

// tableRows makes priors from the limb-darkening table at a channel's
// wavelengths.
func tableRows(setup Setup, channel lightcurve.Channel) (Priors, error) {
	if len(setup.Limb.Channels) == 0 {
		return nil, fmt.Errorf("the limb-darkening policy is %s, but there is no limb-darkening table; give the input limb, or set limbPolicy to free", setup.LimbPolicy)
	}
	if law := setup.Limb.Law; law != "" && !strings.EqualFold(law, setup.LimbLaw) {
		return nil, fmt.Errorf("the limb-darkening table is for the %s law, but the law is %s; set limbLaw to %s", law, setup.LimbLaw, law)
	}
	u1, u2, e1, e2, ok := setup.Limb.At(channel.Lo, channel.Hi)
	if !ok {
		return nil, fmt.Errorf("the limb-darkening table does not reach the channel %.6g to %.6g um; give a table that does, or set limbPolicy to free", channel.Lo, channel.Hi)
	}
	if setup.LimbPolicy == PolicyFixed {
		rows := Priors{held("u1", u1), held("u2", u2)}
		if setup.LimbLaw == LawLinear {
			rows[1].A = 0
		}
		return rows, nil
	}
	row := func(name string, u, e float64) (Prior, error) {
		if !(e > 0) {
			return Prior{}, fmt.Errorf("the limb-darkening table has error %g for %s at %.6g to %.6g um; expected one above 0 for the policy prior, or set limbPolicy to fixed", e, name, channel.Lo, channel.Hi)
		}
		return Prior{Name: name, Kind: Normal, A: u, B: e}, nil
	}
	first, err := row("u1", u1, e1)
	if err != nil {
		return nil, err
	}
	if setup.LimbLaw == LawLinear {
		return Priors{first, held("u2", 0)}, nil
	}
	second, err := row("u2", u2, e2)
	if err != nil {
		return nil, err
	}
	return Priors{first, second}, nil
}
