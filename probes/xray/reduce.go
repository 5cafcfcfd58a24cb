package xray

import (
	"context"
	"encoding"
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// Spectra are temperatures kT in keV, in annuli or, when not Projected, in
// spherical shells.
type Spectra struct {
	Bins
	Projected bool
	// Mixing is the share of the light of annulus j that reaches annulus i, at
	// i·n + j; nil when the telescope is taken to be sharp.
	Mixing []float64
}

// Plausible ranges, wide enough for any galaxy group or cluster; outside them
// the unit or the column is wrong (common practice, no source).
const (
	leastDensity, mostDensity         = 1e-9, 10   // cm⁻³
	leastTemperature, mostTemperature = 0.02, 60.0 // keV
)

// reduceDensity reads shells of electron density and fits the form to them, or
// takes the published form that the block states.
func reduceDensity(_ context.Context, t *estimate.Task) (encoding.BinaryMarshaler, error) {
	block := t.Blocks["density"]
	form := Form(block["model"].Text)
	_, bright := t.Blocks["surface_brightness"]
	switch {
	case bright && block != nil:
		return nil, t.Errorf("both a density and a surface brightness are given; the density is fitted to one of them")
	case bright:
		return reduceBrightness(t)
	case t.Tables["density"] == nil:
		return published(t, form, block)
	}
	for _, p := range ModifiedBeta.parameters() {
		if block[p.name].Set {
			return nil, t.Errorf("the density block states both a file and %s; a form that is fitted to shells finds its own parameters", p.name)
		}
	}
	shells, err := readBins(t, "density", "density")
	if err != nil {
		return nil, err
	}
	table := t.Tables["density"]
	for i, n := range shells.Value {
		if n < leastDensity || n > mostDensity {
			return nil, t.Errorf("%s: an electron density of %g cm**-3 in the shell at %.4g kpc is not that of a cluster's gas; is the column an emission measure, or its unit another?", table.File, n, shells.Inner[i])
		}
	}
	if shells.Len() < 3 {
		return nil, t.Errorf("%s: %d shell(s) of density; a density profile needs at least 3", table.File, shells.Len())
	}
	gas, err := ofShells(shells).fit(form)
	if err != nil {
		return nil, t.Errorf("%s: %w", table.File, err)
	}
	return gas, nil
}

// published returns the gas of a published form with its parameters.
func published(t *estimate.Task, form Form, block method.Settings) (*Gas, error) {
	parameters := form.parameters()
	if parameters == nil {
		return nil, t.Errorf("the density block needs a file, or a model with its parameters")
	}
	g := &Gas{Form: form, Words: "the published " + string(form) + " model"}
	if block["n02"].Set && form == ModifiedBeta && !(block["rc2"].Set && block["beta2"].Set) {
		return nil, t.Errorf("the second component of the density model (n02) needs rc2 and beta2")
	}
	if block["epsilon"].Set && form == ModifiedBeta && !block["rs"].Set {
		return nil, t.Errorf("the density model has epsilon, which needs rs")
	}
	for i, p := range parameters {
		v := block[p.name]
		if !v.Set {
			if !p.optional {
				return nil, t.Errorf("the density model %q needs %s", form, p.name)
			}
			g.Parameters = append(g.Parameters, p.value)
			continue
		}
		scale := 1.0
		if v.Unit == "rad" {
			scale = t.Cosmology.AngularDiameter(t.Object.Redshift)
		}
		x := scale * v.Prior.Median()
		if p.unit != "" && !(x > 0) && p.name != "n02" {
			return nil, t.Errorf("%s = %g of the density model is not positive", p.name, x)
		}
		g.Parameters = append(g.Parameters, x)
		if !v.Prior.IsExact() {
			move := make([]float64, len(parameters))
			move[i] = scale * spread(v.Prior)
			g.Moves = append(g.Moves, move)
		}
	}
	for _, p := range ModifiedBeta.parameters() { // every name there is
		if block[p.name].Set && !form.has(p.name) {
			return nil, t.Errorf("the density model %q has no %s", form, p.name)
		}
	}
	return g, nil
}

// spread is half the distance between the 16th and 84th percentiles.
func spread(p prior.Prior) float64 { return (p.FromScore(1) - p.FromScore(-1)) / 2 }

// reduceTemperature reads temperatures.
func reduceTemperature(_ context.Context, t *estimate.Task) (encoding.BinaryMarshaler, error) {
	bins, err := readBins(t, "temperature", "temperature")
	if err != nil {
		return nil, err
	}
	table := t.Tables["temperature"]
	for i, kT := range bins.Value {
		if kT < leastTemperature || kT > mostTemperature {
			return nil, t.Errorf("%s: a temperature of %g keV in the bin at %.4g kpc is not that of a cluster's gas; is the unit another?", table.File, kT, bins.Inner[i])
		}
	}
	s := &Spectra{Bins: *bins, Projected: true}
	block := t.Blocks["temperature"]
	if v := block["projected"]; v.Set {
		s.Projected = v.Flag
	}
	if spread := t.Tables["temperature.mixing"]; spread != nil {
		if !s.Projected {
			return nil, t.Errorf("the temperatures are those of shells (projected = false): a telescope mixes annuli, not shells; leave out the block mixing")
		}
		inner := t.Kpc(table.Column("inner"))
		if inner == nil {
			inner = t.Kpc(table.Column("radius"))
		}
		n := len(inner)
		if s.Mixing, err = readMixing(t, spread, n, n > 1 && inner[0] > inner[n-1]); err != nil {
			return nil, err
		}
	} else if v := block["psf_width"]; v.Set {
		s.noteBlur(t, v)
	}
	return s, nil
}

// noteBlur says which annuli are narrower than the telescope's point-spread
// function, whose width the block states.
func (s *Spectra) noteBlur(t *estimate.Task, v method.Value) {
	width := v.Prior.A
	if v.Unit == "rad" {
		width *= t.Cosmology.AngularDiameter(t.Object.Redshift)
	}
	narrow := 0
	for i := range s.Value {
		if s.Outer[i]-s.Inner[i] < width {
			narrow++
		}
	}
	if narrow > 0 {
		s.Notes = append(s.Notes, fmt.Sprintf("%d of %d annuli are narrower than the point-spread function (%.4g kpc) and no mixing matrix is given: their temperatures are smeared into each other", narrow, s.Len(), width))
	}
}

// coolest returns the lowest temperature.
func (s *Spectra) coolest() float64 {
	least := math.Inf(1)
	for _, kT := range s.Value {
		least = math.Min(least, kT)
	}
	return least
}
