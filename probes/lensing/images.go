package lensing

import (
	"context"
	"encoding"
	"encoding/binary"
	"fmt"
	"math"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
)

// Images holds families of multiple images, and the places of lenses beside the
// halo. Places are radians east (X) and north (Y) of the object's centre, on the
// plane that touches the sky there.
type Images struct {
	Families   []Family // in the order of the file
	Components []Component
}

// Family is the images of one source.
type Family struct {
	Name     string
	Redshift float64
	Images   []Image
}

// Image is the place of one image, with its error in each coordinate.
type Image struct{ X, Y, Error float64 }

// Component is a lens beside the halo, such as a galaxy.
type Component struct {
	X, Y       float64
	E1, E2     float64 // ellipticity of its potential
	Luminosity float64 // relative to the brightest; 0 where none is given
}

// count is how many images there are.
func (m *Images) count() int {
	n := 0
	for _, f := range m.Families {
		n += len(f.Images)
	}
	return n
}

// field is how far an image may be from the centre: well beyond the arcs of any
// cluster, and near enough for the plane that touches the sky to stand for it.
const field = 10.0 / 60 * math.Pi / 180

// imagesReduction sorts images into families.
var imagesReduction = estimate.Reduction{
	Name: "images", Version: 1,
	From: []string{"images", "components?"},
	Run: func(_ context.Context, t *estimate.Task) (encoding.BinaryMarshaler, error) {
		m, err := readImages(t)
		if err != nil {
			return nil, t.Errorf("%w", err)
		}
		return m, nil
	},
}

func readImages(t *estimate.Task) (*Images, error) {
	table := t.Tables["images"]
	switch {
	case !t.Object.HasCentre:
		return nil, fmt.Errorf("images are placed about a centre: the object needs `centre = sky(…)`")
	case table.Len() == 0:
		return nil, fmt.Errorf("%s: there are no images", table.File)
	}
	m := new(Images)
	places, err := onPlane(t, table)
	if err != nil {
		return nil, err
	}
	source, errors, redshift := table.Column("source").Text, table.Values("error"), table.Values("redshift")
	family := map[string]int{}
	for i, row := range table.Rows {
		z := redshift[i]
		switch {
		case source[i] == "":
			return nil, fmt.Errorf("%s, row %d: the image has no source", table.File, row)
		case !(errors[i] > 0):
			return nil, fmt.Errorf("%s, row %d: an error of %g arcsec is not above zero", table.File, row, errors[i]/arcsec)
		case !(z > t.Object.Redshift && z < farthest):
			return nil, fmt.Errorf("%s, row %d: the source %q at redshift %g is not behind the lens at redshift %g", table.File, row, source[i], z, t.Object.Redshift)
		}
		k, known := family[source[i]]
		if !known {
			k = len(m.Families)
			family[source[i]] = k
			m.Families = append(m.Families, Family{Name: source[i], Redshift: z})
		}
		f := &m.Families[k]
		if f.Redshift != z {
			return nil, fmt.Errorf("%s, row %d: the source %q is at redshift %g here and at %g above; images of one source share its redshift", table.File, row, source[i], z, f.Redshift)
		}
		for _, other := range f.Images {
			if other.X == places[i][0] && other.Y == places[i][1] {
				return nil, fmt.Errorf("%s, row %d: the source %q has an image at this place already", table.File, row, source[i])
			}
		}
		f.Images = append(f.Images, Image{places[i][0], places[i][1], errors[i]})
	}
	for _, f := range m.Families {
		if len(f.Images) < 2 {
			return nil, fmt.Errorf("%s: the source %q has one image, which says nothing of the lens; leave it out", table.File, f.Name)
		}
	}
	if table := t.Tables["components"]; table != nil {
		if m.Components, err = readComponents(t, table); err != nil {
			return nil, err
		}
	}
	return m, nil
}

// readComponents reads the lenses beside the halo.
func readComponents(t *estimate.Task, table *catalogue.Table) ([]Component, error) {
	places, err := onPlane(t, table)
	if err != nil {
		return nil, err
	}
	shape, angle, luminosity := table.Values("ellipticity"), table.Values("position_angle"), table.Values("luminosity")
	brightest := 0.0
	for i := range luminosity {
		if !(luminosity[i] > 0) {
			return nil, fmt.Errorf("%s, row %d: luminosity %g is not above zero", table.File, table.Rows[i], luminosity[i])
		}
		brightest = max(brightest, luminosity[i])
	}
	if (shape == nil) != (angle == nil) {
		return nil, fmt.Errorf("%s: `ellipticity` and `position_angle` belong together", table.File)
	}
	out := make([]Component, table.Len())
	for i := range out {
		out[i] = Component{X: places[i][0], Y: places[i][1]}
		if shape != nil {
			if !(shape[i] >= 0 && shape[i] < roundest) {
				return nil, fmt.Errorf("%s, row %d: an ellipticity of %g of the potential; it lies between 0 and %g", table.File, table.Rows[i], shape[i], roundest)
			}
			// A position angle counts from north through east.
			s, c := math.Sincos(2 * angle[i])
			out[i].E1, out[i].E2 = -shape[i]*c, shape[i]*s
		}
		if luminosity != nil {
			out[i].Luminosity = luminosity[i] / brightest
		}
	}
	return out, nil
}

// onPlane returns the places of a table's rows on the plane that touches the sky
// at the object's centre (the gnomonic projection), through right ascension
// zero and at the poles alike.
func onPlane(t *estimate.Task, table *catalogue.Table) ([][2]float64, error) {
	ra, dec := table.Values("ra"), table.Values("dec")
	s0, c0 := math.Sincos(t.Object.Dec)
	out := make([][2]float64, table.Len())
	for i := range out {
		if !(math.Abs(dec[i]) <= math.Pi/2) {
			return nil, fmt.Errorf("%s, row %d: declination %.6g degrees", table.File, table.Rows[i], dec[i]*180/math.Pi)
		}
		s, c := math.Sincos(dec[i])
		sinRA, cosRA := math.Sincos(ra[i] - t.Object.RA)
		depth := s0*s + c0*c*cosRA
		x, y := c*sinRA/depth, (c0*s-s0*c*cosRA)/depth
		if !(depth > 0 && math.Hypot(x, y) < field) {
			return nil, fmt.Errorf("%s, row %d: %.3g arcmin from the object's centre, beyond the %.0f that arcs of a cluster reach; check `centre` and the units of `ra` and `dec`",
				table.File, table.Rows[i], math.Atan2(math.Hypot(c*sinRA, c0*s-s0*c*cosRA), depth)*60*180/math.Pi, field*60*180/math.Pi)
		}
		out[i] = [2]float64{x, y}
	}
	return out, nil
}

const imagesFormat = "steelyard/lensing/images/1\n"

// MarshalBinary encodes the images: equal images give equal bytes.
func (m *Images) MarshalBinary() ([]byte, error) {
	out := []byte(imagesFormat)
	count := func(n int) { out = binary.LittleEndian.AppendUint64(out, uint64(n)) }
	number := func(xs ...float64) {
		for _, x := range xs {
			if x == 0 {
				x = 0 // negative zero
			}
			out = binary.LittleEndian.AppendUint64(out, math.Float64bits(x))
		}
	}
	count(len(m.Families))
	for _, f := range m.Families {
		count(len(f.Name))
		out = append(out, f.Name...)
		number(f.Redshift)
		count(len(f.Images))
		for _, i := range f.Images {
			number(i.X, i.Y, i.Error)
		}
	}
	count(len(m.Components))
	for _, c := range m.Components {
		number(c.X, c.Y, c.E1, c.E2, c.Luminosity)
	}
	return out, nil
}

// UnmarshalBinary decodes what MarshalBinary wrote, and nothing else.
func (m *Images) UnmarshalBinary(data []byte) error {
	if len(data) < len(imagesFormat) || string(data[:len(imagesFormat)]) != imagesFormat {
		return fmt.Errorf("lensing: not image families of this version")
	}
	r := reader{data: data[len(imagesFormat):]}
	*m = Images{Families: make([]Family, r.length(24))}
	for i := range m.Families {
		f := &m.Families[i]
		f.Name = string(r.take(r.length(1)))
		f.Redshift = r.number()
		f.Images = make([]Image, r.length(24))
		for j := range f.Images {
			f.Images[j] = Image{r.number(), r.number(), r.number()}
		}
	}
	if n := r.length(40); n > 0 {
		m.Components = make([]Component, n)
	}
	for i := range m.Components {
		m.Components[i] = Component{r.number(), r.number(), r.number(), r.number(), r.number()}
	}
	if r.short || len(r.data) > 0 {
		return fmt.Errorf("lensing: damaged image families")
	}
	return nil
}
