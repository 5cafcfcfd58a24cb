package reconcile

import (
	"fmt"

	"steelyard/probes/halo"
	"steelyard/probes/wire"
)

// The encodings of what is handed from node to node.
const (
	jointFormat    = "steelyard joint 1"
	matchingFormat = "steelyard matching 2"
)

// MarshalBinary encodes the joint draws; equal ones give equal bytes.
func (j *Joint) MarshalBinary() ([]byte, error) {
	e := wire.NewEncoder(jointFormat, 8*j.N*(len(j.Order)+len(j.Nuisances)))
	e.Int(j.N)
	e.Texts(j.Nuisances)
	for c := range j.Nuisances {
		column := make([]float64, j.N)
		for i, s := range j.Scores {
			column[i] = s[c]
		}
		e.Floats(column)
	}
	e.Int(len(j.Order))
	for _, order := range j.Order {
		e.Ints(order)
	}
	e.Flag(j.Sampled)
	e.Int(len(j.Tilts))
	for _, tilts := range j.Tilts {
		e.Int(len(tilts))
		for _, t := range tilts {
			e.Text(t.Nuisance)
			e.Float(t.Mean)
			e.Float(t.SD)
		}
	}
	e.Texts(j.Warnings)
	return *e, nil
}

// UnmarshalBinary decodes what MarshalBinary wrote and refuses anything else.
func (j *Joint) UnmarshalBinary(data []byte) error {
	d := wire.NewDecoder(jointFormat, data)
	got := Joint{N: d.Int(), Nuisances: d.Texts()}
	for c := range got.Nuisances {
		column := d.Floats()
		if d.Failed() || len(column) != got.N {
			return fmt.Errorf("reconcile: the scores of the shared nuisances are not whole")
		}
		if c == 0 {
			got.Scores = make([][]float64, got.N)
		}
		for i, s := range column {
			got.Scores[i] = append(got.Scores[i], s)
		}
	}
	for n := d.Count(4); n > 0 && !d.Failed(); n-- {
		got.Order = append(got.Order, d.Ints())
	}
	got.Sampled = d.Flag()
	for n := d.Count(4); n > 0 && !d.Failed(); n-- {
		var tilts []Tilt
		for k := d.Count(20); k > 0 && !d.Failed(); k-- {
			tilts = append(tilts, Tilt{Nuisance: d.Text(), Mean: d.Float(), SD: d.Float()})
		}
		got.Tilts = append(got.Tilts, tilts)
	}
	got.Warnings = d.Texts()
	if err := d.Close(); err != nil {
		return fmt.Errorf("reconcile: %w", err)
	}
	*j = got
	return nil
}

// MarshalBinary encodes the matching; equal ones give equal bytes.
func (m *Matching) MarshalBinary() ([]byte, error) {
	e := wire.NewEncoder(matchingFormat, 0)
	e.Texts(m.Warnings)
	e.Int(len(m.Compared))
	for _, c := range m.Compared {
		e.Text(c.Name)
		e.Text(c.Block)
		e.Float(c.Covers[0])
		e.Float(c.Covers[1])
		e.Flag(c.PoorlyFitted)
		e.Flag(c.NotConverged)
	}
	e.Ints(m.Members)
	e.Int(len(m.Places))
	for _, p := range m.Places {
		e.Float(p.At.Radius)
		encodeDefinition(e, p.At.Definition)
		e.Flag(p.Own)
		encodeInterval(e, p.Radius)
		for k, mark := range p.Marks {
			e.Text(mark.Name)
			e.Float(mark.Radius)
			encodeInterval(e, mark.Mass)
			e.Float(mark.LnMean)
			e.Float(mark.LnSD)
			e.Flag(mark.Extrapolated)
			e.Float(mark.Slope)
			e.Floats(p.LnMass[k])
			e.Floats(p.Common[k])
		}
	}
	e.Int(len(m.Combined))
	for _, c := range m.Combined {
		e.Flag(c.Scattered)
		e.Int(len(c.Own))
		for _, o := range c.Own {
			encodeDefinition(e, o.Definition)
			encodeInterval(e, o.Radius)
			encodeInterval(e, o.Mass)
			e.Flag(o.Extrapolated)
		}
	}
	return *e, nil
}

// UnmarshalBinary decodes what MarshalBinary wrote and refuses anything else.
func (m *Matching) UnmarshalBinary(data []byte) error {
	d := wire.NewDecoder(matchingFormat, data)
	got := Matching{Warnings: d.Texts()}
	for n := d.Count(26); n > 0 && !d.Failed(); n-- {
		got.Compared = append(got.Compared, Compared{
			Name: d.Text(), Block: d.Text(), Covers: [2]float64{d.Float(), d.Float()}, PoorlyFitted: d.Flag(), NotConverged: d.Flag(),
		})
	}
	got.Members = d.Ints()
	for n := d.Count(17); n > 0 && !d.Failed(); n-- {
		p := Matched{At: At{Radius: d.Float(), Definition: decodeDefinition(d)}, Own: d.Flag(), Radius: decodeInterval(d)}
		for range got.Compared {
			p.Marks = append(p.Marks, Mark{
				Name: d.Text(), Radius: d.Float(), Mass: decodeInterval(d),
				LnMean: d.Float(), LnSD: d.Float(), Extrapolated: d.Flag(), Slope: d.Float(),
			})
			p.LnMass, p.Common = append(p.LnMass, d.Floats()), append(p.Common, d.Floats())
		}
		got.Places = append(got.Places, p)
	}
	for n := d.Count(5); n > 0 && !d.Failed(); n-- {
		c := CombinedProfile{Scattered: d.Flag()}
		for k := d.Count(61); k > 0 && !d.Failed(); k-- {
			c.Own = append(c.Own, OwnMass{Definition: decodeDefinition(d), Radius: decodeInterval(d), Mass: decodeInterval(d), Extrapolated: d.Flag()})
		}
		got.Combined = append(got.Combined, c)
	}
	if err := d.Close(); err != nil {
		return fmt.Errorf("reconcile: %w", err)
	}
	*m = got
	return nil
}

func encodeInterval(e *wire.Encoder, i Interval) {
	e.Float(i.Median)
	e.Float(i.Lo)
	e.Float(i.Hi)
}

func decodeInterval(d *wire.Decoder) Interval {
	return Interval{Median: d.Float(), Lo: d.Float(), Hi: d.Float()}
}

func encodeDefinition(e *wire.Encoder, f halo.Definition) {
	e.Float(f.Delta)
	e.Text(f.Of)
}

func decodeDefinition(d *wire.Decoder) halo.Definition {
	return halo.Definition{Delta: d.Float(), Of: d.Text()}
}
