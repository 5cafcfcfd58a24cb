package assemble

import (
	"fmt"
	"slices"
	"strings"

	"steelyard/probes/method"
)

// neutral says in words what it means that an assumption is exactly at the value
// where it changes nothing.
var neutral = map[string]struct {
	value float64
	words string
}{
	"temperature_scale":     {1, "temperatures calibrated exactly"},
	"nonthermal_fraction":   {0, "no hydrostatic bias"},
	"clumping":              {1, "gas that is not clumped"},
	"shear_bias":            {0, "shears calibrated exactly"},
	"dilution":              {0, "no cluster members among the sources"},
	"source_distance_scale": {1, "source distances known exactly"},
	"miscentring":           {0, "the stated centre"},
	"elongation":            {1, "a halo as long along the line of sight as across"},
	"velocity_bias":         {1, "galaxies that move like the dark matter"},
	"intrinsic_scatter":     {0, "no scatter of the mass about the spherical truth"},
	"interloper_fraction":   {0, "no interlopers"},
}

// given lists what a verdict on the named estimates takes for certain: the
// assumptions that the recipe leaves without an error. Estimates that take the
// same for certain are named together.
func (p *Plan) given(names []string) []string {
	var words []string
	of := map[string][]string{}
	for _, name := range names {
		settings, declared := p.declared(name)
		for _, d := range declared {
			v := settings[d.Name]
			n, known := neutral[d.Name]
			if d.Kind != method.Number || !v.Set || !known || !v.Prior.IsExact() || v.Relation != "" {
				continue
			}
			text := n.words
			if v.Prior.A != n.value {
				if d.Default.Set && d.Default.Prior == v.Prior {
					continue // a scatter that the method states, for one
				}
				text = fmt.Sprintf("%s exactly %g", d.Name, v.Prior.A)
			}
			if of[text] == nil {
				words = append(words, text)
			}
			if !slices.Contains(of[text], name) {
				of[text] = append(of[text], name)
			}
		}
	}
	for i, text := range words {
		if list := of[text]; len(list) < len(names) {
			words[i] = text + " (" + strings.Join(list, ", ") + ")"
		}
	}
	return words
}
