package dynamics

import (
	"fmt"
	"math"
	"sort"
	"strings"

	"steelyard/probes/catalogue"
	"steelyard/probes/constants"
	"steelyard/probes/estimate"
)

// fewest is the number of members below which no dispersion is given: the
// normality test and the bootstrap say nothing any more (common practice, no
// source).
const fewest = 8

// readGalaxies checks the columns of a catalogue and places each galaxy
// relative to the centre.
func readGalaxies(t *estimate.Task, table *catalogue.Table, choice string) ([]Galaxy, centre, error) {
	ra, dec, redshift := table.Values("ra"), table.Values("dec"), table.Values("redshift")
	errors, weights := table.Values("error"), table.Values("weight")
	if table.Len() < fewest {
		return nil, centre{}, t.Errorf("%s: %d galaxies are too few; a velocity dispersion needs at least %d", table.File, table.Len(), fewest)
	}
	galaxies := make([]Galaxy, table.Len())
	scale := t.Cosmology.AngularDiameter(t.Object.Redshift)
	for i := range galaxies {
		g := &galaxies[i]
		*g = Galaxy{Row: table.Rows[i], RA: ra[i], Dec: dec[i], Redshift: redshift[i], Weight: 1}
		if errors != nil {
			g.Error = errors[i]
		}
		if weights != nil {
			g.Weight = weights[i]
		}
	}
	if err := checkGalaxies(t, table.File, galaxies); err != nil {
		return nil, centre{}, err
	}
	c, err := findCentre(t, table, choice)
	if err != nil {
		return nil, c, err
	}
	near := false
	for i := range galaxies {
		g := &galaxies[i]
		g.East, g.North = offset(c.ra, c.dec, g.RA, g.Dec)
		// Galaxies 10 degrees off belong to another object.
		near = near || math.Hypot(g.East, g.North) < 10*math.Pi/180
		g.East, g.North = g.East*scale, g.North*scale
		g.Radius = math.Hypot(g.East, g.North)
	}
	if !near {
		return nil, c, t.Errorf("%s: no galaxy lies within 10 deg of the object's centre; check the centre and the units of ra and dec", table.File)
	}
	return galaxies, c, nil
}

// checkGalaxies refuses what cannot be a catalogue of redshifts, all rows of
// one mistake at once.
func checkGalaxies(t *estimate.Task, file string, galaxies []Galaxy) error {
	for _, mistake := range []struct {
		is   func(Galaxy) bool
		text string
	}{
		{func(g Galaxy) bool { return g.Redshift > 20 }, "the redshift is above 20; a velocity in km/s must be divided by c = 299792.458 km/s first"},
		{func(g Galaxy) bool { return g.Redshift <= -0.1 }, "the redshift is below −0.1"},
		{func(g Galaxy) bool { return g.Error < 0 }, "the redshift error is negative"},
		{func(g Galaxy) bool { return g.Error >= 1 }, "the redshift error is 1 or more; an error in km/s must be divided by c = 299792.458 km/s first"},
		{func(g Galaxy) bool { return g.Weight < 0 }, "the weight is negative"},
		{func(g Galaxy) bool { return math.Abs(g.Dec) > math.Pi/2 }, "the declination lies beyond ±90 deg"},
	} {
		var rows []int
		for _, g := range galaxies {
			if mistake.is(g) {
				rows = append(rows, g.Row)
			}
		}
		if len(rows) > 0 {
			return t.Errorf("%s, %s: %s", file, rowList(rows), mistake.text)
		}
	}
	return nil
}

// rowList names the first few rows of a long list.
func rowList(rows []int) string {
	const most = 5
	var names []string
	for _, r := range rows[:min(most, len(rows))] {
		names = append(names, fmt.Sprint(r))
	}
	list := strings.Join(names, ", ")
	if more := len(rows) - most; more > 0 {
		list += fmt.Sprintf(" and %d more", more)
	}
	if len(rows) == 1 {
		return "row " + list
	}
	return "rows " + list
}

// offset returns where a point lies from a centre, in rad to the east and to
// the north: the great-circle distance in the direction of the position angle.
func offset(ra0, dec0, ra, dec float64) (east, north float64) {
	sinHalf := func(x float64) float64 { return math.Sin(x / 2) }
	h := sinHalf(dec-dec0)*sinHalf(dec-dec0) + math.Cos(dec0)*math.Cos(dec)*sinHalf(ra-ra0)*sinHalf(ra-ra0)
	distance := 2 * math.Asin(math.Min(1, math.Sqrt(h)))
	angle := math.Atan2(math.Sin(ra-ra0)*math.Cos(dec),
		math.Cos(dec0)*math.Sin(dec)-math.Sin(dec0)*math.Cos(dec)*math.Cos(ra-ra0))
	return distance * math.Sin(angle), distance * math.Cos(angle)
}

// velocity is the line-of-sight velocity in km/s of redshift z in the frame of
// a cluster at mean redshift mean, v = c (z − z̄)/(1 + z̄) (Danese, De Zotti &
// di Tullio 1980).
func velocity(z, mean float64) float64 {
	return constants.SpeedOfLight * (z - mean) / (1 + mean)
}

// markDuplicates rejects galaxies that lie within so many kpc of another one
// whose velocity is within 1000 km/s: one galaxy listed twice, which would count
// twice and make the pair separations of the virial radius vanish. The entry
// with the smaller error stays, else the first. It returns how many were
// rejected.
func markDuplicates(galaxies []Galaxy, within float64) int {
	order := make([]int, len(galaxies))
	for i := range order {
		order[i] = i
	}
	sort.SliceStable(order, func(a, b int) bool { return galaxies[order[a]].North < galaxies[order[b]].North })
	found := 0
	for a, i := range order {
		for _, j := range order[a+1:] {
			if galaxies[j].North-galaxies[i].North > within {
				break
			}
			g, h := &galaxies[i], &galaxies[j]
			if g.Reason != "" || h.Reason != "" || math.Hypot(g.East-h.East, g.North-h.North) > within {
				continue
			}
			if math.Abs(velocity(g.Redshift, h.Redshift)) > 1000 {
				continue
			}
			keep, drop := g, h
			if h.Error < g.Error || (h.Error == g.Error && h.Row < g.Row) {
				keep, drop = h, g
			}
			drop.Twice = true
			drop.Reason = fmt.Sprintf("duplicate of row %d", keep.Row)
			found++
		}
	}
	return found
}
