package lensing

import (
	"context"
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
	"steelyard/probes/prior"
)

// Places of images are so precise that the posterior fills a part of the prior
// too small to find by chance. The search for it is by least squares: from many
// starts with the χ² of the source plane, and from the best of these with that
// of the image plane. The posterior is then drawn around the best, in
// coordinates in which it is about a unit normal.

const (
	searches = 32  // starts of the search
	finishes = 6   // the best of them, which go on in the image plane
	reach    = 1.5 // standard deviations of the distribution that the draws are weighed against
)

// residuals is the least-squares form of the posterior of the images: their
// distances in units of the errors, and the prior scores z themselves. The
// scatter of the positions, which no sum of squares can tell, is held. It is
// false where there is no lens.
func (p *imagesPart) residuals(z, out []float64, finish bool) bool {
	theta := p.fit.physical(z)
	l, ok := p.fit.at(theta)
	if !ok {
		return false
	}
	d, ok := p.deflector(l)
	if !ok {
		return false
	}
	at := 0
	for k := range p.images.Families {
		f := &p.images.Families[k]
		res := out[at : at+2*len(f.Images)]
		at += len(res)
		if finish {
			d.imagePlane(f, p.beta[k], p.held, res)
		} else {
			d.sourcePlane(f, p.beta[k], p.held, res)
		}
	}
	copy(out[at:], z)
	for _, r := range out {
		if math.IsNaN(r) || math.IsInf(r, 0) {
			return false
		}
	}
	return true
}

// start is the best point found, in prior scores, with the Cholesky factor of
// the covariance there.
type start struct {
	z      []float64
	cost   float64
	factor mat.TriDense
}

// search finds where the draws start: the most likely lens of the images.
func (p *imagesPart) search(ctx context.Context) (*start, error) {
	dim := len(p.fit.parameters.Free)
	rng := p.fit.task.Sampling.Stream.Sub("images").Rand(0)
	p.held = p.scatter.Of(p.fit.physical(make([]float64, dim)))
	var found []*start
	for i := range searches {
		z := make([]float64, dim)
		for j := range z {
			if v := rng.NormFloat64(); i > 0 { // the first is the middle of the prior
				z[j] = 0.8 * v
			}
		}
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if s := p.descend(z, false); s != nil {
			found = append(found, s)
		}
	}
	best, err := p.finish(found)
	if err != nil || !p.scatter.Drawn() {
		return best, err
	}
	// Again with the scatter that the best lens has left.
	l, _ := p.fit.at(p.fit.physical(best.z))
	rms, _, _ := p.rms(l)
	n := float64(p.images.count())
	left := rms*rms*n/max(2*n-2*float64(len(p.images.Families))-float64(p.drawn+p.fit.halo.drawn), 1) - p.meanError2()
	p.held = math.Sqrt(max(left, p.meanError2()/16))
	if best, err = p.finish([]*start{best}); err != nil {
		return nil, err
	}
	for j, free := range p.fit.parameters.Free {
		if free.Name == "position_scatter" {
			best.z[j] = free.Prior.Score(p.held)
		}
	}
	return best, nil
}

// finish goes on in the image plane from the best of the starts.
func (p *imagesPart) finish(found []*start) (*start, error) {
	byCost := func(s []*start) { sort.SliceStable(s, func(i, j int) bool { return s[i].cost < s[j].cost }) }
	byCost(found)
	var finished []*start
	for _, s := range found[:min(finishes, len(found))] {
		if s = p.descend(s.z, true); s != nil {
			finished = append(finished, s)
		}
	}
	if byCost(finished); len(finished) == 0 {
		return nil, p.fit.task.Errorf("no lens was found that bends light to the images: widen the priors, or check the families")
	}
	return finished[0], nil
}

// descend minimises the sum of squares from z by the method of Levenberg and
// Marquardt (Marquardt 1963), with slopes by differences. It is nil where there
// is no lens.
func (p *imagesPart) descend(z []float64, finish bool) *start {
	dim, n := len(z), 2*p.images.count()+len(z)
	res, moved := make([]float64, n), make([]float64, n)
	z = slices.Clone(z)
	if !p.residuals(z, res, finish) {
		return nil
	}
	slopes := mat.NewDense(n, dim, nil)
	cost, damping := dot(res, res), 1e-2
	for range 100 {
		p.slopes(z, res, moved, slopes, finish)
		var normal mat.SymDense
		normal.SymOuterK(1, slopes.T())
		var gradient mat.VecDense
		gradient.MulVec(slopes.T(), mat.NewVecDense(n, res))
		improved := 0.0
		for ; damping < 1e8; damping *= 4 {
			damped := mat.NewSymDense(dim, nil)
			damped.CopySym(&normal)
			for j := range dim {
				damped.SetSym(j, j, normal.At(j, j)*(1+damping))
			}
			var factor mat.Cholesky
			var step mat.VecDense
			if !factor.Factorize(damped) || factor.SolveVecTo(&step, &gradient) != nil {
				continue
			}
			trial := slices.Clone(z)
			for j := range trial {
				trial[j] -= step.AtVec(j)
			}
			if !p.residuals(trial, moved, finish) {
				continue
			}
			if c := dot(moved, moved); c < cost {
				improved = cost - c
				z, cost = trial, c
				copy(res, moved)
				damping = max(damping/10, 1e-8)
				break
			}
		}
		if improved < 1e-3 {
			break
		}
	}
	s := &start{z: z, cost: cost}
	p.slopes(z, res, moved, slopes, finish)
	var normal, covariance mat.SymDense
	normal.SymOuterK(1, slopes.T())
	var factor mat.Cholesky
	if !factor.Factorize(&normal) || factor.InverseTo(&covariance) != nil || !factor.Factorize(&covariance) {
		return nil
	}
	factor.LTo(&s.factor)
	return s
}

// slopes fills out with the derivatives of the residuals at z, where they are
// res.
func (p *imagesPart) slopes(z, res, room []float64, out *mat.Dense, finish bool) {
	at := slices.Clone(z)
	for j := range z {
		for _, h := range []float64{1e-5, -1e-5} {
			at[j] = z[j] + h
			if p.residuals(at, room, finish) {
				for i := range room {
					out.Set(i, j, (room[i]-res[i])/h)
				}
				break
			}
		}
		at[j] = z[j]
	}
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += a[i] * b[i]
	}
	return sum
}

// drawAround draws the posterior around s. In the coordinates u of z = z₀ + L u
// the problem is given the priors u ~ N(0, reach²) and a likelihood that
// divides them out again.
func (f *lensFit) drawAround(ctx context.Context, s *start) (*infer.Sample, error) {
	dim := len(s.z)
	wide, err := prior.Normal(0, reach)
	if err != nil {
		return nil, err
	}
	place := func(u []float64) []float64 {
		z := slices.Clone(s.z)
		for i := range z {
			for j := range i + 1 {
				z[i] += s.factor.At(i, j) * u[j]
			}
		}
		return z
	}
	lnVolume := float64(dim) * math.Log(reach)
	for i := range dim {
		lnVolume += math.Log(s.factor.At(i, i))
	}
	problem := infer.Problem{Likelihood: func() func([]float64) float64 {
		likelihood := f.likelihood()
		return func(u []float64) float64 {
			z := place(u)
			return likelihood(f.physical(z)) + (dot(u, u)/(reach*reach)-dot(z, z))/2 + lnVolume
		}
	}}
	for _, free := range f.parameters.Free {
		problem.Free = append(problem.Free, infer.Free{Name: free.Name, Prior: wide})
	}
	sample, err := infer.DrawPosterior(ctx, problem, f.task.Sampling)
	if err != nil {
		return nil, err
	}
	// The problem's likelihood is not that of the data, by which the best is chosen.
	likelihood := f.likelihood()
	sample.Best = f.physical(s.z)
	sample.BestLog = likelihood(sample.Best)
	for i, u := range sample.Values {
		theta := f.physical(place(u))
		sample.Values[i] = theta
		if ln := likelihood(theta); ln > sample.BestLog {
			sample.Best, sample.BestLog = theta, ln
		}
	}
	return sample, nil
}

// physical turns prior scores into parameters.
func (f *lensFit) physical(z []float64) []float64 {
	theta := make([]float64, len(z))
	for j, free := range f.parameters.Free {
		theta[j] = free.Prior.FromScore(z[j])
	}
	return theta
}
