package lensing

import (
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// imagesPart holds a lens to the places of multiple images.
type imagesPart struct {
	fit         *lensFit
	images      *Images
	beta        []float64 // of each family
	distance    float64   // kpc per radian
	critical    float64   // Σ_cr of a source at infinity, Msun/kpc²
	centre      [2]estimate.Ref
	ellipticity [2]estimate.Ref
	shear       [2]estimate.Ref
	dispersions []estimate.Ref // one for each component, or one for all that have luminosities
	core, cut   float64        // of the components, kpc
	scatter     estimate.Ref
	held        float64 // the scatter while the lens is searched for
	drawn       int     // how many of the parameters are of the images
}

// addImages adds the image families that the task's reduction made.
func (f *lensFit) addImages() error {
	t := f.task
	m := new(Images)
	if err := m.UnmarshalBinary(t.Reduced["images"]); err != nil {
		return t.Errorf("%w", err)
	}
	p := &imagesPart{
		fit: f, images: m, distance: t.Cosmology.AngularDiameter(t.Object.Redshift),
		critical: t.Cosmology.SigmaCritical(t.Object.Redshift, math.Inf(1)),
		core:     t.Settings["component_core_radius"].Prior.A, cut: t.Settings["component_cut_radius"].Prior.A,
	}
	e := newEfficiencies(t.Cosmology, t.Object.Redshift, t.Object.Redshift)
	for _, family := range m.Families {
		p.beta = append(p.beta, e.exact(family.Redshift))
	}
	before := len(f.parameters.Free)
	for _, pair := range []struct {
		setting, unit string
		names         [2]string
		refs          *[2]estimate.Ref
	}{
		{"centre_error", "kpc", [2]string{"centre_east", "centre_north"}, &p.centre},
		{"ellipticity", "", [2]string{"ellipticity_1", "ellipticity_2"}, &p.ellipticity},
		{"external_shear", "", [2]string{"external_shear_1", "external_shear_2"}, &p.shear},
	} {
		spread := prior.Exact(0)
		if sd := t.Settings[pair.setting].Prior.A; sd > 0 {
			var err error
			if spread, err = prior.Normal(0, sd); err != nil {
				return t.Errorf("%s: %w", pair.setting, err)
			}
		}
		for i, name := range pair.names {
			pair.refs[i] = f.parameters.Draw(name, pair.unit, spread)
		}
	}
	switch {
	case len(m.Components) == 0:
	case m.Components[0].Luminosity > 0:
		p.dispersions = []estimate.Ref{f.parameters.Assume(t.Settings, "component_dispersion")}
	default:
		v := t.Settings["component_dispersion"]
		if v.Nuisance != "" {
			return t.Errorf("component_dispersion: each component has a dispersion of its own, which cannot be one shared nuisance; give them a `luminosity`")
		}
		for i := range m.Components {
			p.dispersions = append(p.dispersions, f.parameters.Assume(
				method.Settings{fmt.Sprintf("component_dispersion_%d", i+1): v}, fmt.Sprintf("component_dispersion_%d", i+1)))
		}
	}
	if p.core >= p.cut {
		return t.Errorf("component_cut_radius: %.4g kpc does not lie beyond component_core_radius, %.4g kpc", p.cut, p.core)
	}
	p.scatter = f.parameters.Assume(t.Settings, "position_scatter")
	p.drawn = len(f.parameters.Free) - before
	f.parts = append(f.parts, p)
	f.images = p
	return nil
}

// component is the component i at theta. Of components with luminosities,
// σ ∝ L^¼ (Faber & Jackson 1976, ApJ 204, 668), and core and cut grow as L^½,
// so that all have one mass-to-light ratio.
func (p *imagesPart) component(i int, theta []float64) truncated {
	if l := p.images.Components[i].Luminosity; l > 0 {
		r := math.Sqrt(l)
		return newTruncated(p.dispersions[0].Of(theta)*math.Sqrt(r), p.core*r, p.cut*r)
	}
	return newTruncated(p.dispersions[i].Of(theta), p.core, p.cut)
}

// deflector is what bends the light at one point of parameter space; not ok
// where there is none.
func (p *imagesPart) deflector(l lens) (d *deflector, ok bool) {
	theta := l.theta
	e1, e2 := p.ellipticity[0].Of(theta), p.ellipticity[1].Of(theta)
	d = &deflector{
		distance: p.distance, main: l.Model, critical: p.critical, scale: l.elongation / p.critical, efficiency: l.distance,
		place: shape{p.centre[0].Of(theta) / p.distance, p.centre[1].Of(theta) / p.distance, e1, e2},
		shear: [2]float64{p.shear[0].Of(theta), p.shear[1].Of(theta)},
	}
	for i, c := range p.images.Components {
		d.galaxies = append(d.galaxies, p.component(i, theta))
		d.places = append(d.places, shape{c.X, c.Y, c.E1, c.E2})
	}
	return d, math.Hypot(e1, e2) < roundest && p.scatter.Of(theta) >= 0
}

// likelihood is that of the places of the images, each family's source
// marginalised over the source plane with an even prior:
//
//	ln L = −χ²/2 − Σ ln(2πσ²) + Σ_families [ln 2π − ½ ln det Σ_i A_i⁻²/σ_i²],
//
// A being the derivative of the source's place by the image's, at the images
// of the best source. χ² is that of the image plane.
func (p *imagesPart) likelihood() func(lens) float64 {
	residuals := make([]float64, 2*p.images.count())
	return func(l lens) float64 {
		d, ok := p.deflector(l)
		if !ok {
			return math.Inf(-1)
		}
		scatter := p.scatter.Of(l.theta)
		sum, at := 0.0, 0
		for k := range p.images.Families {
			f := &p.images.Families[k]
			res := residuals[at : at+2*len(f.Images)]
			at += len(res)
			lnDet, _ := d.imagePlane(f, p.beta[k], scatter, res)
			sum += math.Log(2*math.Pi) - lnDet/2
			for i, image := range f.Images {
				sum -= (res[2*i]*res[2*i]+res[2*i+1]*res[2*i+1])/2 + math.Log(2*math.Pi*(image.Error*image.Error+scatter*scatter))
			}
		}
		if math.IsNaN(sum) {
			return math.Inf(-1)
		}
		return sum
	}
}

// rms is the root mean square distance in radians between the images and those
// of the model, with χ² and the number of families that the model does not
// make, for which the distances are those of the source plane, carried back.
func (p *imagesPart) rms(l lens) (rms, chi2 float64, missing int) {
	d, _ := p.deflector(l)
	scatter := p.scatter.Of(l.theta)
	sum := 0.0
	for k := range p.images.Families {
		f := &p.images.Families[k]
		res := make([]float64, 2*len(f.Images))
		if _, made := d.imagePlane(f, p.beta[k], scatter, res); !made {
			missing++
		}
		for i, image := range f.Images {
			r2 := res[2*i]*res[2*i] + res[2*i+1]*res[2*i+1]
			chi2 += r2
			sum += r2 * (image.Error*image.Error + scatter*scatter)
		}
	}
	return math.Sqrt(sum / float64(p.images.count())), chi2, missing
}

// meanError2 is the mean square error of the places in one coordinate.
func (p *imagesPart) meanError2() float64 {
	sum := 0.0
	for _, f := range p.images.Families {
		for _, image := range f.Images {
			sum += image.Error * image.Error
		}
	}
	return sum / float64(p.images.count())
}
