package reconcile

import (
	"fmt"

	"steelyard/probes/halo"
	"steelyard/probes/wire"
)

// format names the encoding of a Matching.
const format = "steelyard matching 1"

// MarshalBinary encodes the matching; equal ones give equal bytes.
func (m *Matching) MarshalBinary() ([]byte, error) {
	e := wire.NewEncoder(format, 0)
	e.Texts(m.Names)
	e.Texts(m.Blocks)
	e.Texts(m.Warnings)
	e.Int(len(m.Places))
	for _, p := range m.Places {
		e.Float(p.At.Radius)
		e.Float(p.At.Definition.Delta)
		e.Text(p.At.Definition.Of)
		e.Flag(p.Own)
		for k, mark := range p.Marks {
			e.Text(mark.Name)
			for _, v := range []float64{mark.Radius, mark.Mass.Median, mark.Mass.Lo, mark.Mass.Hi, mark.LnMean, mark.LnSD} {
				e.Float(v)
			}
			e.Flag(mark.Extrapolated)
			e.Floats(p.LnMass[k])
			e.Floats(p.Common[k])
		}
	}
	return *e, nil
}

// UnmarshalBinary decodes what MarshalBinary wrote and refuses anything else.
func (m *Matching) UnmarshalBinary(data []byte) error {
	d := wire.NewDecoder(format, data)
	got := Matching{Names: d.Texts(), Blocks: d.Texts(), Warnings: d.Texts()}
	if len(got.Names) != len(got.Blocks) {
		return fmt.Errorf("reconcile: %d names for %d blocks", len(got.Names), len(got.Blocks))
	}
	for n := d.Count(17); n > 0 && !d.Failed(); n-- {
		p := Matched{At: At{Radius: d.Float(), Definition: halo.Definition{Delta: d.Float(), Of: d.Text()}}, Own: d.Flag()}
		for range got.Names {
			p.Marks = append(p.Marks, Mark{
				Name: d.Text(), Radius: d.Float(), Mass: Interval{Median: d.Float(), Lo: d.Float(), Hi: d.Float()},
				LnMean: d.Float(), LnSD: d.Float(), Extrapolated: d.Flag(),
			})
			p.LnMass, p.Common = append(p.LnMass, d.Floats()), append(p.Common, d.Floats())
		}
		got.Places = append(got.Places, p)
	}
	if err := d.Close(); err != nil {
		return fmt.Errorf("reconcile: %w", err)
	}
	*m = got
	return nil
}
