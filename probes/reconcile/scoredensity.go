package reconcile

import (
	"math"
	"slices"
)

// scoreDensity is the density of points known by draws, as a chain: each
// coordinate is a curve in those before it plus a residual, whose size is a curve
// too and whose shape is a density of its own,
//
//	p(s) = Π_c p_c((s_c − f_c(s_<c))/g_c(s_<c)) / g_c(s_<c) .
//
// Of all orders of the coordinates it is the one under which the draws are most
// likely.
type scoreDensity []link

// link is one coordinate of the chain.
type link struct {
	of       int   // the coordinate
	given    []int // those before it
	center   *curve
	spread   *curve // of ln|residual|
	residual *logDensity
}

func newScoreDensity(draws [][]float64) (scoreDensity, error) {
	var best scoreDensity
	most := math.Inf(-1)
	for _, order := range permutations(len(draws[0])) {
		d, err := chain(draws, order)
		if err != nil {
			return nil, err
		}
		sum := 0.0
		for _, s := range draws {
			sum += d.log(s)
		}
		if sum > most {
			most, best = sum, d
		}
	}
	return best, nil
}

// permutations lists the orders of up to three coordinates; of more, one.
func permutations(n int) [][]int {
	switch n {
	case 1:
		return [][]int{{0}}
	case 2:
		return [][]int{{0, 1}, {1, 0}}
	case 3:
		return [][]int{{0, 1, 2}, {0, 2, 1}, {1, 0, 2}, {1, 2, 0}, {2, 0, 1}, {2, 1, 0}}
	}
	one := make([]int, n)
	for i := range one {
		one[i] = i
	}
	return [][]int{one}
}

func chain(draws [][]float64, order []int) (scoreDensity, error) {
	var d scoreDensity
	for c, of := range order {
		l := link{of: of, given: order[:c]}
		rows, y := make([][]float64, len(draws)), make([]float64, len(draws))
		for i, s := range draws {
			rows[i], y[i] = pick(s, l.given), s[of]
		}
		if c > 0 {
			var err error
			if l.center, err = choose(rows, y, 0, 1, 2, 3); err != nil {
				return nil, err
			}
			size := make([]float64, len(y))
			for i := range y {
				y[i] -= l.center.at(rows[i])
				size[i] = math.Log(math.Abs(y[i]) + 1e-12)
			}
			if l.spread, err = choose(rows, size, 0, 1, 2); err != nil {
				return nil, err
			}
			for i := range y {
				y[i] /= math.Exp(l.spread.at(rows[i]))
			}
		}
		l.residual = newLogDensity(y)
		d = append(d, l)
	}
	return d, nil
}

// log is the log density at s.
func (d scoreDensity) log(s []float64) float64 {
	sum := 0.0
	for _, l := range d {
		x := s[l.of]
		if len(l.given) > 0 {
			given := pick(s, l.given)
			spread := l.spread.at(given)
			x = (x - l.center.at(given)) / math.Exp(spread)
			sum -= spread
		}
		sum += l.residual.log(x)
	}
	return sum
}

// curve is a polynomial with its coefficients.
type curve struct {
	*polynomial
	coef []float64
}

func (c *curve) at(x []float64) float64 {
	sum := 0.0
	for t, power := range c.powers {
		v := c.coef[t]
		for j, k := range power {
			u := (x[j] - c.mean[j]) / c.sd[j]
			for range k {
				v *= u
			}
		}
		sum += v
	}
	return sum
}

// choose regresses y on rows by the polynomial whose degree, of those given,
// explains it best for its number of terms (Schwarz 1978).
func choose(rows [][]float64, y []float64, degrees ...int) (*curve, error) {
	var best *curve
	least := math.Inf(1)
	for _, degree := range degrees {
		p := newPolynomial(rows, degree)
		design := p.design(rows)
		fit, err := newLeastSquares(design)
		if err != nil {
			return nil, err
		}
		coef, sum := slices.Clone(fit.solve(design, y)), 0.0
		for i, v := range y {
			for t, d := range design.RawRowView(i) {
				v -= d * coef[t]
			}
			sum += v * v
		}
		n := float64(len(y))
		if criterion := n*math.Log(sum/n+1e-300) + float64(len(coef))*math.Log(n); criterion < least {
			least, best = criterion, &curve{p, coef}
		}
	}
	return best, nil
}
