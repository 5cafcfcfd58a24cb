package lensing

import (
	"context"
	"fmt"
	"math"
	"sort"
	"sync"
)

// chunk is how many galaxies are summed at a time. It is a constant, so that
// the sums do not depend on the number of workers.
const chunk = 1 << 14

// moments is how many powers of a galaxy's place in its bin are summed.
const moments = 6

// annulus sums the galaxies of one bin.
type annulus struct {
	n                            int
	w, w2                        float64 // Σ w, Σ w²
	tangential, cross, flipped   float64 // Σ w e; flipped is tangential with e2 reversed
	tangential2, cross2, square2 float64 // Σ w² e_t, Σ w² e_x, Σ w² (e_t² + e_x²)
	calibrated                   float64 // Σ w (1+m)
	radius, beta, beta2          float64 // Σ w R, Σ w β, Σ w β²
	place                        [moments]float64
}

func (a *annulus) add(b *annulus) {
	a.n += b.n
	a.w += b.w
	a.w2 += b.w2
	a.tangential += b.tangential
	a.cross += b.cross
	a.flipped += b.flipped
	a.tangential2 += b.tangential2
	a.cross2 += b.cross2
	a.square2 += b.square2
	a.calibrated += b.calibrated
	a.radius += b.radius
	a.beta += b.beta
	a.beta2 += b.beta2
	for k := range a.place {
		a.place[k] += b.place[k]
	}
}

// sums is what a part of the catalogue adds up to.
type sums struct {
	bins       []annulus
	directions directions
	weight     float64 // of all galaxies, in a bin or not
	err        error   // the first galaxy that cannot be used
}

// gather sums the catalogue over the bins: the workers fill one part a chunk,
// which are then added in order.
func (s *shapes) gather(ctx context.Context, workers int) (*sums, error) {
	parts := make([]sums, (len(s.rows)+chunk-1)/chunk)
	next := make(chan int)
	var wait sync.WaitGroup
	for range max(1, workers) {
		wait.Go(func() {
			for i := range next {
				parts[i] = s.sum(i*chunk, min((i+1)*chunk, len(s.rows)))
			}
		})
	}
	for i := range parts {
		if ctx.Err() != nil {
			break
		}
		next <- i
	}
	close(next)
	wait.Wait()
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	total := &sums{bins: make([]annulus, len(s.edges)-1)}
	for i := range parts {
		if parts[i].err != nil {
			return nil, parts[i].err
		}
		total.weight += parts[i].weight
		for j := range total.bins {
			total.bins[j].add(&parts[i].bins[j])
		}
		for j := range total.directions {
			total.directions[j] = total.directions[j] || parts[i].directions[j]
		}
	}
	return total, nil
}

// sum adds up the galaxies of rows from ≤ i < to.
func (s *shapes) sum(from, to int) sums {
	part := sums{bins: make([]annulus, len(s.edges)-1)}
	width := make([]float64, len(part.bins))
	for j := range width {
		width[j] = math.Log(s.edges[j+1] / s.edges[j])
	}
	inner, outer := s.edges[0], s.edges[len(s.edges)-1]
	for i := from; i < to; i++ {
		w := 1.0
		if s.weight != nil {
			w = s.weight[i]
		}
		if part.err = s.check(i, w); part.err != nil {
			return part
		}
		if w == 0 {
			continue
		}
		part.weight += w
		at := s.centre.locate(s.ra[i], s.dec[i])
		part.directions.mark(at)
		r := at.angle * s.distance
		if !(r >= inner && r < outer) {
			continue
		}
		j := sort.Search(len(width), func(j int) bool { return r < s.edges[j+1] })
		beta, beta2 := s.beta, s.beta2
		if s.redshift != nil {
			beta = s.efficiencies.at(s.redshift[i])
			beta2 = beta * beta
		}
		e1, e2 := s.e1[i]-s.additive1, s.mirror*(s.e2[i]-s.additive2)
		m := 0.0
		if s.bias != nil {
			m = s.bias[i]
		}
		tangential, cross := at.components(e1, e2)
		flipped, _ := at.components(e1, -e2)
		a := &part.bins[j]
		a.n++
		a.w += w
		a.w2 += w * w
		a.tangential += w * tangential
		a.cross += w * cross
		a.flipped += w * flipped
		a.tangential2 += w * w * tangential
		a.cross2 += w * w * cross
		a.square2 += w * w * (tangential*tangential + cross*cross)
		a.calibrated += w * (1 + m)
		a.radius += w * r
		a.beta += w * beta
		a.beta2 += w * beta2
		u, power := 2*math.Log(r/s.edges[j])/width[j]-1, w
		for k := range a.place {
			a.place[k] += power
			power *= u
		}
	}
	return part
}

// check refuses a galaxy that cannot be used.
func (s *shapes) check(i int, w float64) error {
	switch e := math.Hypot(s.e1[i], s.e2[i]); {
	case !(e < 1):
		return fmt.Errorf("%s, row %d: an ellipticity of %.4g, where (a−b)/(a+b) is below 1; leave out such rows with `select`, or convert shapes measured as (a²−b²)/(a²+b²)", s.file, s.rows[i], e)
	case s.bias != nil && !(s.bias[i] > -1):
		return fmt.Errorf("%s, row %d: a multiplicative bias of %g leaves no shear", s.file, s.rows[i], s.bias[i])
	case !(w >= 0):
		return fmt.Errorf("%s, row %d: weight %g is below zero", s.file, s.rows[i], w)
	case !(math.Abs(s.dec[i]) <= math.Pi/2):
		return fmt.Errorf("%s, row %d: declination %.6g degrees", s.file, s.rows[i], s.dec[i]*180/math.Pi)
	}
	return nil
}

// directions marks the sectors of the sky, seen from the centre, in which there
// are galaxies.
type directions [256]bool

func (d *directions) mark(p place) {
	turn := math.Atan2(p.northward, p.eastward)/(2*math.Pi) + 0.5
	d[min(int(turn*float64(len(d))), len(d)-1)] = true
}

// gap is the widest angle in radians without a galaxy. At π or more the centre
// lies outside the galaxies' convex hull.
func (d *directions) gap() float64 {
	widest, run := 0, 0
	for i := range 2 * len(d) {
		if d[i%len(d)] {
			run = 0
			continue
		}
		run++
		widest = max(widest, run)
	}
	return 2 * math.Pi * float64(min(widest, len(d))) / float64(len(d))
}
