package infer

import "math"

// A symmetric matrix and its Cholesky factor are stored row by row in d×d
// slices; the dimension is small (2 to about 12), and the inner loops below run
// once for every point and component.

// cholesky overwrites a with its lower factor and zeros above the diagonal. It
// returns false, leaving a spoilt, when a is not positive definite.
func cholesky(a []float64, d int) bool {
	for i := 0; i < d; i++ {
		for j := 0; j <= i; j++ {
			sum := a[i*d+j]
			for k := 0; k < j; k++ {
				sum -= a[i*d+k] * a[j*d+k]
			}
			if i != j {
				a[i*d+j] = sum / a[j*d+j]
				continue
			}
			if !(sum > 0) || math.IsInf(sum, 1) {
				return false
			}
			a[i*d+i] = math.Sqrt(sum)
		}
		for j := i + 1; j < d; j++ {
			a[i*d+j] = 0
		}
	}
	return true
}

// whitened sets y = L⁻¹(x − m) and returns |y|², the squared Mahalanobis
// distance of x from m.
func whitened(y, l, x, m []float64) float64 {
	d, sum := len(x), 0.0
	for i := range d {
		v := x[i] - m[i]
		for j := range i {
			v -= l[i*d+j] * y[j]
		}
		y[i] = v / l[i*d+i]
		sum += y[i] * y[i]
	}
	return sum
}

// unwhitened sets x = m + s·L y.
func unwhitened(x, l, y, m []float64, s float64) {
	d := len(x)
	for i := range d {
		v := 0.0
		for j := 0; j <= i; j++ {
			v += l[i*d+j] * y[j]
		}
		x[i] = m[i] + s*v
	}
}

// lnDet is ln of the determinant of the factor L.
func lnDet(l []float64, d int) float64 {
	sum := 0.0
	for i := range d {
		sum += math.Log(l[i*d+i])
	}
	return sum
}

func identity(d int) []float64 {
	a := make([]float64, d*d)
	for i := range d {
		a[i*d+i] = 1
	}
	return a
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}

// rows cuts n points of d coordinates out of one allocation.
func rows(n, d int) [][]float64 {
	flat := make([]float64, n*d)
	out := make([][]float64, n)
	for i := range out {
		out[i] = flat[i*d : (i+1)*d : (i+1)*d]
	}
	return out
}
