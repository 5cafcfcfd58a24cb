package lensing

import "math"

// soft keeps the weights of the source plane finite on critical curves: it
// bounds the magnification of a direction to ten.
const soft = 0.1

// sourcePlane fills res with the distances of a family's images from their best
// common source, in units of the errors:
//
//	r_i = (A_i² + s²)^(−½) (β_i − β̄)/σ_i,
//
// distances in the source plane carried back to the image plane, to first
// order. It is smooth wherever the lens is, which is what a search from afar
// needs. It returns ln det Σ (A_i² + s²)⁻¹/σ_i².
func (d *deflector) sourcePlane(f *Family, beta, scatter float64, res []float64) (lnDet float64) {
	weights := make([]symmetric, len(f.Images))
	var sum symmetric
	var sx, sy float64
	for i, image := range f.Images {
		x, y, a := d.source(image.X, image.Y, beta)
		m := a.square()
		m.a += soft * soft
		m.c += soft * soft
		w := m.inverse()
		sigma2 := image.Error*image.Error + scatter*scatter
		w = symmetric{w.a / sigma2, w.b / sigma2, w.c / sigma2}
		weights[i] = w.root()
		sum.a, sum.b, sum.c = sum.a+w.a, sum.b+w.b, sum.c+w.c
		wx, wy := w.times(x, y)
		sx, sy = sx+wx, sy+wy
		res[2*i], res[2*i+1] = x, y
	}
	sx, sy = sum.inverse().times(sx, sy)
	for i, w := range weights {
		res[2*i], res[2*i+1] = w.times(res[2*i]-sx, res[2*i+1]-sy)
	}
	return math.Log(sum.det())
}

const (
	mostSteps   = 30
	longestStep = 2 * arcsec // of one step of an image
	closeEnough = 1e-3       // of an error
)

// imagePlane fills res with the distances of a family's images from those that
// the lens makes of their best common source, in units of the errors. Images
// and source are found together: each step moves every image to where, to first
// order, the source has it, and the source to where the images are nearest to
// those seen (Newton's and Gauss's methods). The first step, from the images
// seen, is the χ² of the source plane.
//
// Where the steps do not end, the lens does not make all the images; then made
// is false and res is that of the source plane. lnDet is ln det Σ A_i⁻²/σ_i².
func (d *deflector) imagePlane(f *Family, beta, scatter float64, res []float64) (lnDet float64, made bool) {
	n := len(f.Images)
	var room [16]place2
	places := room[:0]
	for _, image := range f.Images {
		places = append(places, place2{x: image.X, y: image.Y})
	}
	for range mostSteps {
		var sum symmetric
		var vx, vy float64
		for i := range n {
			p, image := &places[i], &f.Images[i]
			var a symmetric
			p.sx, p.sy, a = d.source(p.x, p.y, beta)
			if math.Abs(a.det()) < 1e-6 {
				return d.sourcePlane(f, beta, scatter, res), false
			}
			p.magnify = a.inverse()
			sigma2 := image.Error*image.Error + scatter*scatter
			w := p.magnify.square()
			sum.a, sum.b, sum.c = sum.a+w.a/sigma2, sum.b+w.b/sigma2, sum.c+w.c/sigma2
			mx, my := p.magnify.times(p.sx, p.sy)
			wx, wy := p.magnify.times(image.X-p.x+mx, image.Y-p.y+my)
			vx, vy = vx+wx/sigma2, vy+wy/sigma2
		}
		sx, sy := sum.inverse().times(vx, vy)
		ended := true
		for i := range n {
			p := &places[i]
			dx, dy := p.magnify.times(sx-p.sx, sy-p.sy)
			length := math.Hypot(dx, dy)
			if !(length < math.MaxFloat64) {
				return d.sourcePlane(f, beta, scatter, res), false
			}
			if length > closeEnough*f.Images[i].Error {
				ended = false
			}
			if length > longestStep {
				dx, dy = dx*longestStep/length, dy*longestStep/length
			}
			p.x, p.y = p.x+dx, p.y+dy
		}
		if !ended {
			continue
		}
		for i, image := range f.Images {
			sigma := math.Sqrt(image.Error*image.Error + scatter*scatter)
			res[2*i], res[2*i+1] = (places[i].x-image.X)/sigma, (places[i].y-image.Y)/sigma
		}
		return math.Log(sum.det()), true
	}
	return d.sourcePlane(f, beta, scatter, res), false
}

// place2 is an image on its way, the source it maps back to, and its
// magnification.
type place2 struct {
	x, y, sx, sy float64
	magnify      symmetric
}
