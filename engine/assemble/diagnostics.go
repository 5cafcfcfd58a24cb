package assemble

import (
	"fmt"

	"steelyard/engine"
	"steelyard/probes/infer"
)

// encodeDraws encodes draws, with what the sampler and the checks said of them
// for the node's record.
func encodeDraws(d *infer.Draws) (engine.Output, error) {
	out, err := encode(d)
	q := d.Quality
	said := fmt.Sprintf("%d draws by %s, worth %.0f", d.N, q.Sampler, q.EffectiveDraws)
	if !q.Converged {
		said += ", not converged"
	}
	out.Diagnostics = append(out.Diagnostics, said)
	if q.Dof > 0 {
		out.Diagnostics = append(out.Diagnostics, fmt.Sprintf("χ² = %.1f for %d", q.Chi2, q.Dof))
	}
	for _, c := range d.Checks {
		said := fmt.Sprintf("%s %.3g", c.Name, c.Statistic)
		if c.PValue >= 0 {
			said += fmt.Sprintf(" (p = %.2g)", c.PValue)
		}
		if !c.Passed {
			said += " FAILED"
		}
		out.Diagnostics = append(out.Diagnostics, said)
	}
	out.Diagnostics = append(out.Diagnostics, d.Warnings...)
	return out, err
}
