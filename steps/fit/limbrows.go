package fit

import (
	"fmt"
	"strings"

	"rimlight/steps/lightcurve"
	"rimlight/steps/limb"
)

// limbRows settles how limb darkening is treated in the fit of one curve: it
// returns the priors table with its rows on limb darkening taken, dropped or
// replaced by others, and what to warn of.
//
// The law decides which coefficients exist. In a white fit (byTable false) the
// rows count whatever the policy, which speaks of channels, and the policy only
// fills in where there are none. In a channel fit the policy decides: rows count
// where it is "free".
func limbRows(priors Priors, model Model, channel lightcurve.Channel, byTable bool) (Priors, []string, error) {
	n, err := limb.Count(model.LimbLaw)
	if err != nil {
		return nil, nil, err
	}
	var rest, rows Priors
	var warnings []string
	for _, p := range priors {
		switch {
		case !isLimb(p.Name):
			rest = append(rest, p)
		case family(p.Name)[0] == "q1" && n != 2 && n != 0:
			return nil, nil, fmt.Errorf("%s belongs to a law of two coefficients, but the law is %s; give a prior for u1", p.Name, model.LimbLaw)
		case p.Name[1]-'0' > byte(n):
			warnings = append(warnings, fmt.Sprintf("the prior on %s is not used: the law is %s", p.Name, model.LimbLaw))
		default:
			rows = append(rows, p)
		}
	}
	if n == 0 {
		return rest, warnings, nil
	}
	if model.LimbPolicy == PolicyFree || !byTable && len(rows) > 0 {
		if len(rows) == 0 {
			return nil, nil, fmt.Errorf("the limb-darkening policy is free, but the priors table has no rows for it; add %s", wantedRows(n))
		}
		return append(rest, rows...), warnings, nil
	}
	fromTable, err := tableRows(model, channel, n)
	if err != nil {
		return nil, nil, err
	}
	return append(rest, fromTable...), warnings, nil
}

// wantedRows names what a priors table needs for a law of n coefficients.
func wantedRows(n int) string {
	switch n {
	case 1:
		return "u1 (for example U(-1, 2))"
	case 2:
		return "u1 and u2 (for example U(-1, 2)), or q1 and q2 (for example U(0, 1))"
	}
	return fmt.Sprintf("u1 to u%d (for example N(0.5, 0.3))", n)
}

// tableRows makes priors of the n coefficients from the limb-darkening table at a
// channel's wavelengths.
func tableRows(model Model, channel lightcurve.Channel, n int) (Priors, error) {
	if len(model.Limb.Channels) == 0 {
		return nil, fmt.Errorf("the limb-darkening policy is %s, but there is no limb-darkening table; give the input limb, or set limbPolicy to free", model.LimbPolicy)
	}
	table := model.Limb
	switch {
	case table.Law != "" && !strings.EqualFold(table.Law, model.LimbLaw):
		return nil, fmt.Errorf("the limb-darkening table is for the %.40s law, but the law is %s; set limbLaw to %.40s", table.Law, model.LimbLaw, table.Law)
	case table.Law == "" && n > 2:
		return nil, fmt.Errorf("the limb-darkening table does not say that it is for the %s law; give one that does, or set limbPolicy to free", model.LimbLaw)
	}
	if _, _, _, _, ok := table.At(channel.Lo, channel.Hi); !ok {
		return nil, fmt.Errorf("the limb-darkening table does not reach the channel %.6g to %.6g um; give a table that does, or set limbPolicy to free", channel.Lo, channel.Hi)
	}
	table.Law = model.LimbLaw
	law, errs, err := table.LawAt(channel.Lo, channel.Hi)
	if err != nil {
		return nil, err
	}
	var rows Priors
	for k, u := range law.Coefficients {
		row := Prior{Name: fmt.Sprintf("u%d", k+1), Kind: Fixed, A: u}
		if model.LimbPolicy == PolicyPrior {
			if row.Kind, row.B = Normal, errs[k]; !(row.B > 0) {
				return nil, fmt.Errorf("the limb-darkening table has error %g for %s at %.6g to %.6g um; expected one above 0 for the policy prior, or set limbPolicy to fixed", row.B, row.Name, channel.Lo, channel.Hi)
			}
		}
		rows = append(rows, row)
	}
	return rows, nil
}
