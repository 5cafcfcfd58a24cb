package xray

import (
	"steelyard/probes/halo"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

var haloSetting = method.Setting{
	Name: "halo", Kind: method.Choice, Choices: []string{"nfw", "einasto", "hernquist", "isothermal", "cored-isothermal"}, Default: method.Word("nfw"),
	Doc: "the mass model", Source: "Navarro, Frenk & White 1997; Einasto 1965; Hernquist 1990",
}

var massSetting = method.Setting{
	Name: "mass", Kind: method.Number, Unit: "solMass", Low: 1e9, High: 1e18,
	Default: method.Distributed(prior.LogUniform(1e12, 1e16)), Doc: "prior on M_200c",
}

// chooseHalo adds the parameters of the mass model beside its mass.
func (b *backwardFit) chooseHalo() error {
	threshold := 200 * b.task.Cosmology.CriticalDensity(b.task.Object.Redshift)
	p, s := &b.parameters, b.task.Settings
	switch s["halo"].Text {
	case "isothermal":
		b.halo = func(theta []float64) halo.Model { return halo.NewIsothermal(b.mass.Of(theta), threshold) }
		return nil
	case "cored-isothermal":
		core := p.Assume(s, "core")
		b.shape = []string{"core"}
		b.halo = func(theta []float64) halo.Model {
			return halo.NewCoredIsothermal(b.mass.Of(theta), core.Of(theta), threshold)
		}
		return nil
	}
	b.shape = []string{"concentration"}
	c, err := p.Concentration(b.task)
	if err != nil {
		return err
	}
	if c.Related() {
		b.concentration = func(theta []float64) float64 { return c.Of(theta, b.mass.Of(theta)) }
	}
	switch s["halo"].Text {
	case "nfw":
		b.halo = func(theta []float64) halo.Model {
			m := b.mass.Of(theta)
			return halo.NewNFW(m, c.Of(theta, m), threshold)
		}
	case "einasto":
		b.shape = append(b.shape, "shape")
		shape := p.Assume(s, "shape")
		b.halo = func(theta []float64) halo.Model {
			m := b.mass.Of(theta)
			return halo.NewEinasto(m, c.Of(theta, m), shape.Of(theta), threshold)
		}
	case "hernquist":
		b.halo = func(theta []float64) halo.Model {
			m := b.mass.Of(theta)
			return halo.NewHernquist(m, c.Of(theta, m), threshold)
		}
	default:
		return b.task.Errorf("no mass model is called %q", s["halo"].Text)
	}
	return nil
}

func relationNames() []string {
	var names []string
	for _, r := range halo.Relations() {
		names = append(names, r.Name)
	}
	return names
}
