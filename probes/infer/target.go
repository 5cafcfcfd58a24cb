package infer

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"sync"
	"sync/atomic"
)

// chunk is the number of points one goroutine evaluates at a time. It fixes
// which random generator makes which proposal, so it must not depend on the
// number of workers.
const chunk = 64

// farthest is the score beyond which the prior is taken as empty: Φ(−37) is
// 6e-300, the last that a float64 holds.
const farthest = 37.0

// target is a posterior in prior-score coordinates z, in which the prior is a
// unit normal in every direction. It counts what it evaluates and keeps the
// point of highest likelihood.
type target struct {
	free    []Free
	dim     int
	workers []*worker
	spent   int
	best    []float64 // physical values
	bestLog float64
}

// worker is the scratch space of one goroutine.
type worker struct {
	likelihood  func(theta []float64) float64
	theta, lent []float64 // lent is what the likelihood sees, and may spoil
}

// visit is what a piece of work did with its evaluations.
type visit struct {
	spent   int
	best    []float64
	bestLog float64
}

func newTarget(p Problem, workers int) (*target, error) {
	t := &target{free: p.Free, dim: len(p.Free), bestLog: math.Inf(-1)}
	if t.dim == 0 {
		return nil, errors.New("infer: there is no free parameter to draw")
	}
	for _, f := range p.Free {
		if f.Prior.IsExact() {
			return nil, fmt.Errorf("infer: %s is an exact number and cannot be drawn", f.Name)
		}
	}
	for range max(1, workers) {
		l, err := startLikelihood(p)
		if err != nil {
			return nil, err
		}
		t.workers = append(t.workers, &worker{likelihood: l, theta: make([]float64, t.dim), lent: make([]float64, t.dim)})
	}
	return t, nil
}

func startLikelihood(p Problem) (l func([]float64) float64, err error) {
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("infer: the likelihood could not be prepared: %v", r)
		}
	}()
	return p.Likelihood(), nil
}

// logPosterior returns ln of likelihood times prior density in z. A likelihood
// that panics or is not a number is an error that names the parameters.
func (t *target) logPosterior(w *worker, v *visit, z []float64) (float64, error) {
	lnPrior := lnUnitNormal(z)
	for j, s := range z {
		if !(math.Abs(s) <= farthest) {
			return math.Inf(-1), nil
		}
		w.theta[j] = t.free[j].Prior.FromScore(s)
	}
	l, err := t.guarded(w)
	if err != nil {
		return 0, err
	}
	v.spent++
	if l > v.bestLog || v.best == nil {
		v.best, v.bestLog = append(v.best[:0], w.theta...), l
	}
	return l + lnPrior, nil
}

func (t *target) guarded(w *worker) (l float64, err error) {
	defer func() {
		if r := recover(); r != nil {
			err = fmt.Errorf("infer: the likelihood failed at %s: %v", t.name(w.theta), r)
		}
	}()
	copy(w.lent, w.theta)
	l = w.likelihood(w.lent)
	if math.IsNaN(l) || math.IsInf(l, 1) {
		return 0, fmt.Errorf("infer: the log likelihood is %v at %s", l, t.name(w.theta))
	}
	return l, nil
}

// name spells a point for a message.
func (t *target) name(theta []float64) string {
	parts := make([]string, t.dim)
	for j, f := range t.free {
		parts[j] = strings.TrimSpace(fmt.Sprintf("%s = %.6g %s", f.Name, theta[j], f.Unit))
	}
	return strings.Join(parts, ", ")
}

func (t *target) count(v visit) {
	t.spent += v.spent
	if v.best != nil && (t.best == nil || v.bestLog > t.bestLog) {
		t.best, t.bestLog = v.best, v.bestLog
	}
}

// each runs work(0) … work(n−1) on the target's workers and folds their visits
// in index order, so that the outcome does not depend on how many there are.
// Of several errors it returns the one of lowest index.
func (t *target) each(ctx context.Context, n int, work func(w *worker, v *visit, i int) error) error {
	visits := make([]visit, n)
	errs := make([]error, n)
	var next atomic.Int64
	var failed atomic.Bool
	var wg sync.WaitGroup
	for _, w := range t.workers {
		wg.Go(func() {
			for !failed.Load() {
				i := int(next.Add(1)) - 1
				if i >= n {
					return
				}
				visits[i].bestLog = math.Inf(-1)
				if errs[i] = ctx.Err(); errs[i] == nil {
					errs[i] = work(w, &visits[i], i)
				}
				if errs[i] != nil {
					failed.Store(true)
				}
			}
		})
	}
	wg.Wait()
	for i, v := range visits {
		if errs[i] != nil {
			return errs[i]
		}
		t.count(v)
	}
	return nil
}

// evaluate returns the log posterior of every point.
func (t *target) evaluate(ctx context.Context, points [][]float64) ([]float64, error) {
	out := make([]float64, len(points))
	err := t.each(ctx, chunks(len(points)), func(w *worker, v *visit, c int) error {
		for i := c * chunk; i < min((c+1)*chunk, len(points)); i++ {
			l, err := t.logPosterior(w, v, points[i])
			if err != nil {
				return err
			}
			out[i] = l
		}
		return nil
	})
	return out, err
}

func chunks(n int) int { return (n + chunk - 1) / chunk }

// lnUnitNormal is the log density of independent unit normals.
func lnUnitNormal(z []float64) float64 {
	sum := 0.0
	for _, s := range z {
		sum += s * s
	}
	return -sum/2 - float64(len(z))*lnRoot2Pi
}

const lnRoot2Pi = 0.918938533204672741780329736406 // ln √(2π)
