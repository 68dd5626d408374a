package chain

import "fmt"

// EnergyFraction is the E-BFMI of each chain of a Hamiltonian sampler (Betancourt
// 2016): the mean square change of the energy from one draw to the next over its
// variance. Where it is small, below about 0.3, new momenta move the chain too
// little between levels of the density to see its tails. It is NaN for a chain
// whose energy does not vary.
//
// Errors: chains of fewer than 8 draws or of different lengths; energies that are
// not finite.
func EnergyFraction(energy []float64, chains int) ([]float64, error) {
	if err := checkColumn(energy, chains); err != nil && err != errConstant {
		return nil, fmt.Errorf("energy fraction: %w", err)
	}
	out := make([]float64, chains)
	n := len(energy) / chains
	for c := range chains {
		own := energy[c*n : (c+1)*n]
		_, variance := meanVariance(own)
		change := 0.0
		for i := 1; i < n; i++ {
			change += (own[i] - own[i-1]) * (own[i] - own[i-1])
		}
		out[c] = change / (variance * float64(n-1))
	}
	return out, nil
}
