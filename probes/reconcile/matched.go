package reconcile

import (
	"errors"
	"fmt"
	"math"
	"slices"

	"steelyard/probes/halo"
	"steelyard/probes/infer"
)

// Matching holds the compared estimates' masses at every place.
type Matching struct {
	Compared []Compared
	Members  []int // of Compared: those that are independent evidence
	Places   []Matched
	Combined []CombinedProfile
	Warnings []string
}

// Compared is what a comparison must know of an estimate besides its masses.
type Compared struct {
	Name         string
	Block        string     // whose data it is made from
	Covers       [2]float64 // kpc
	PoorlyFitted bool       // its fit has p < 1e-3
	NotConverged bool       // its draws cannot be trusted
}

// poorFit is the p-value below which a fit is called poor.
const poorFit = 1e-3

// Matched holds every estimate's mass at one place.
type Matched struct {
	At  At
	Own bool // read at each estimate's own radius rather than at one radius
	// Radius is R_Δ of the estimate whose radii are matched, in kpc: the median is
	// the radius of the place. Zero where the radius was fixed or is each
	// estimate's own.
	Radius Interval
	Marks  []Mark
	// LnMass[k][i] is ln M of estimate k in joint draw i; Common[k][i] is the part
	// of it that the shared nuisances of draw i carry, nil when nothing is shared.
	LnMass, Common [][]float64
}

// Mark is one estimate's mass at one place, from its own draws alone.
type Mark struct {
	Name         string
	Radius       float64 // kpc; the median where each draw has its own
	Mass         Interval
	LnMean, LnSD float64
	Extrapolated bool
	// Slope is by how much the mean ln M rises when the radius moves by its own
	// error; 0 where Matched.Radius is.
	Slope float64
}

// MatchAll reads the joint draws at every place: at one radius for all, which
// for an overdensity is the median R_Δ of the estimate RadiiFrom, or (Own) each
// at its own radius, draw by draw.
func MatchAll(s Setup, joint *Joint, stream infer.Stream) (*Matching, error) {
	if len(s.Estimates) < 2 {
		return nil, errors.New("a comparison needs two estimates or more")
	}
	m := &Matching{Warnings: slices.Clone(joint.Warnings)}
	carriers := make([]*carrier, len(s.Estimates))
	for k, e := range s.Estimates {
		q := e.alone().Quality
		m.Compared = append(m.Compared, Compared{
			Name: e.Name, Block: e.Block, Covers: e.Draws.Covers,
			PoorlyFitted: q.Dof > 0 && q.PValue < poorFit, NotConverged: !q.Converged,
		})
		var err error
		if carriers[k], err = joint.newCarrier(k, e); err != nil {
			return nil, err
		}
	}
	m.Members = s.members(m)
	m.Warnings = append(m.Warnings, m.doubts(s.RadiiFrom)...)
	for _, at := range s.Places {
		place, err := s.match(carriers, at)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", at, err)
		}
		m.Places = append(m.Places, *place)
	}
	return m, s.combineProfiles(m, carriers, stream)
}

// members lists the estimates that are independent evidence: of those made from
// the same data the preferred one, or the first. Draws that are the same number
// for number are one estimate under two names.
func (s Setup) members(m *Matching) []int {
	for k, e := range s.Estimates {
		for l, f := range s.Estimates[:k] {
			if slices.Equal(e.Draws.LnMass, f.Draws.LnMass) {
				m.Compared[k].Block = m.Compared[l].Block
				m.Warnings = append(m.Warnings, fmt.Sprintf("%s and %s are the same draw by draw: one mass, not two", f.Name, e.Name))
				break
			}
		}
	}
	var members []int
	for k, c := range m.Compared {
		if s.representative(m.Compared, c.Block) == k {
			members = append(members, k)
		}
	}
	return members
}

// representative is the preferred estimate among those made from a block's data,
// the first of them when none is.
func (s Setup) representative(compared []Compared, block string) int {
	first := -1
	for k, c := range compared {
		if c.Block != block {
			continue
		}
		if slices.Contains(s.Preferred, c.Name) {
			return k
		}
		if first < 0 {
			first = k
		}
	}
	return first
}

// doubts says once what holds at every place.
func (m *Matching) doubts(radiiFrom string) []string {
	var out []string
	for a, x := range m.Compared {
		if x.NotConverged {
			line := fmt.Sprintf("%s did not converge: no number that uses it can be trusted", x.Name)
			if x.Name == radiiFrom {
				line += ", nor the radii, which are its own"
			}
			out = append(out, line)
		}
		if x.PoorlyFitted {
			out = append(out, fmt.Sprintf("%s is poorly fitted: its error does not cover what its model misses, and every tension with it is overstated or misplaced", x.Name))
		}
		for _, y := range m.Compared[a+1:] {
			if x.Block != y.Block && (x.Covers[0] > y.Covers[1]*(1+edge) || y.Covers[0] > x.Covers[1]*(1+edge)) {
				out = append(out, fmt.Sprintf("%s (%s) and %s (%s) have no radius in common: wherever they are compared, one of them is extrapolated",
					x.Name, span(x.Covers), y.Name, span(y.Covers)))
			}
		}
	}
	return out
}

func span(covers [2]float64) string {
	if covers[0] == covers[1] {
		return fmt.Sprintf("%.0f kpc", covers[0])
	}
	return fmt.Sprintf("%.0f to %.0f kpc", covers[0], covers[1])
}

func (s Setup) match(carriers []*carrier, at At) (*Matched, error) {
	m := &Matched{At: at, Own: at.Radius == 0 && s.RadiiFrom == Own}
	radius, threshold := at.Radius, 0.0
	if at.Radius == 0 {
		var err error
		if threshold, err = s.Background.threshold(at.Definition); err != nil {
			return nil, err
		}
		if !m.Own {
			if m.Radius, err = s.referenceRadius(threshold); err != nil {
				return nil, err
			}
			radius = m.Radius.Median
		}
	}
	for k, e := range s.Estimates {
		mark, err := read(e.alone(), radius, threshold, m.Radius)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", e.Name, err)
		}
		mark.Name = e.Name
		m.Marks = append(m.Marks, mark)
		var ln, common []float64
		if m.Own {
			profile := carriers[k].profile()
			_, ln, _ = ownRadii(profile, threshold)
			if common, err = carriers[k].commonPart(ln); err != nil {
				return nil, fmt.Errorf("%s: %w", e.Name, err)
			}
		} else if ln, common, err = carriers[k].at(radius); err != nil {
			return nil, fmt.Errorf("%s: %w", e.Name, err)
		}
		m.LnMass, m.Common = append(m.LnMass, ln), append(m.Common, common)
	}
	return m, nil
}

func (s Setup) referenceRadius(threshold float64) (Interval, error) {
	for _, e := range s.Estimates {
		if e.Name == s.RadiiFrom {
			d := e.alone()
			radii, _, outside := ownRadii(d, threshold)
			if 2*outside > d.N {
				return Interval{}, fmt.Errorf("most draws of %s have no such radius between 1 kpc and 30 Mpc", e.Name)
			}
			return interval(radii), nil
		}
	}
	return Interval{}, fmt.Errorf("the estimate %q, whose radii were asked for, is not among those compared", s.RadiiFrom)
}

// read gives an estimate's mass from its own draws inside radius, or inside each
// draw's own radius of the mean density threshold when radius is 0.
func read(d *infer.Draws, radius, threshold float64, around Interval) (Mark, error) {
	if radius == 0 {
		radii, ln, outside := ownRadii(d, threshold)
		r := interval(radii).Median
		return newMark(r, ln, outside > 0 || extrapolated(d.Covers, r)), nil
	}
	ln, ok := d.LnMassesAt(math.Log(radius))
	if !ok {
		return Mark{}, fmt.Errorf("%.4g kpc is outside the grid of radii, %.4g to %.4g kpc", radius, d.Radii[0], d.Radii[len(d.Radii)-1])
	}
	mark := newMark(radius, ln, extrapolated(d.Covers, radius))
	if around.Median > 0 {
		lo, below := d.LnMassesAt(math.Log(around.Lo))
		hi, above := d.LnMassesAt(math.Log(around.Hi))
		if below && above {
			inner, _ := meanSD(lo)
			outer, _ := meanSD(hi)
			mark.Slope = (outer - inner) / 2
		}
	}
	return mark, nil
}

func newMark(radius float64, ln []float64, extrapolated bool) Mark {
	m := Mark{Radius: radius, Mass: expInterval(ln), Extrapolated: extrapolated}
	m.LnMean, m.LnSD = meanSD(ln)
	return m
}

// OwnMass is an estimate's mass inside its own radius of an overdensity.
type OwnMass struct {
	Definition   halo.Definition
	Radius       Interval // kpc
	Mass         Interval // Msun
	Extrapolated bool
}

// OwnMasses reads an estimate at its own radii, R_Δ and M_Δ found draw by draw.
func OwnMasses(d *infer.Draws, definitions []halo.Definition, b Background) ([]OwnMass, error) {
	out := make([]OwnMass, len(definitions))
	for k, def := range definitions {
		threshold, err := b.threshold(def)
		if err != nil {
			return nil, err
		}
		radii, ln, outside := ownRadii(d, threshold)
		mass, radius := expInterval(ln), interval(radii)
		out[k] = OwnMass{def, radius, mass, outside > 0 || extrapolated(d.Covers, radius.Median)}
	}
	return out, nil
}

// ownRadii returns each draw's R_Δ in kpc and ln M_Δ, and how many draws have
// no such radius on the grid; those are put at its nearer end.
func ownRadii(d *infer.Draws, threshold float64) (radii, ln []float64, outside int) {
	radii, ln = make([]float64, d.N), make([]float64, d.N)
	for i := range d.N {
		r, ok := d.RadiusAt(i, threshold)
		if ok {
			radii[i], ln[i] = r, math.Log(4*math.Pi/3*threshold)+3*math.Log(r)
			continue
		}
		outside++
		r = d.Radii[0]
		if last := d.Radii[len(d.Radii)-1]; 3*math.Exp(d.LnMassAt(i, math.Log(last))) > 4*math.Pi*threshold*last*last*last {
			r = last
		}
		radii[i], ln[i] = r, d.LnMassAt(i, math.Log(r))
	}
	return radii, ln, outside
}

// edge allows 1%, so that a mass at one radius is not called extrapolated at
// that radius for the rounding of its draws.
const edge = 0.01

func extrapolated(covers [2]float64, r float64) bool {
	return r < covers[0]*(1-edge) || r > covers[1]*(1+edge)
}
