package dynamics

import (
	"encoding/json"
	"fmt"
	"math"
)

// Galaxy is one galaxy of the catalogue and the verdict on it.
type Galaxy struct {
	Row      int     `json:"row"`      // in the file, from 1
	RA       float64 `json:"ra"`       // rad
	Dec      float64 `json:"dec"`      // rad
	Redshift float64 `json:"redshift"` // as the file has it
	Error    float64 `json:"error"`    // of the redshift; 0 where there is none
	Weight   float64 `json:"weight"`   // 1 where there is none
	East     float64 `json:"east"`     // kpc from the centre, in the plane of the sky
	North    float64 `json:"north"`    // kpc
	Radius   float64 `json:"radius"`   // kpc, projected
	Velocity float64 `json:"velocity"` // km/s about the mean redshift, in the cluster's frame
	Twice    bool    `json:"twice"`    // listed twice, and left out for it
	Core     bool    `json:"core"`     // for caustic: kept by clipping, which sets the level of the caustics
	Limit    float64 `json:"limit"`    // largest |v| that a member may have where it lies, by sigma-clip and caustic; else 0
	Member   bool    `json:"member"`
	Reason   string  `json:"reason"` // why it is a member or not
}

// Members is the list of galaxies with the verdict on each: what the file says,
// where each galaxy lies and how fast it moves in the frame of the cluster.
type Members struct {
	Schema    string   `json:"schema"`
	File      string   `json:"file"`
	Method    string   `json:"method"`
	CentreRA  float64  `json:"centre_ra"`  // rad
	CentreDec float64  `json:"centre_dec"` // rad
	Redshift  float64  `json:"redshift"`   // biweight mean of the members
	Window    float64  `json:"window"`     // km/s about the object's redshift; 0 where all were given
	HasErrors bool     `json:"has_errors"`
	Weighted  bool     `json:"weighted"`
	Galaxies  []Galaxy `json:"galaxies"` // in the order of the file
	Notes     []string `json:"notes"`    // how the selection was made
	Warnings  []string `json:"warnings"`
}

const membersSchema = "steelyard/members/1"

// MarshalBinary encodes the list as JSON, every number with the digits that
// give it back exactly.
func (m *Members) MarshalBinary() ([]byte, error) {
	m.Schema = membersSchema
	return json.Marshal(m)
}

// UnmarshalBinary reads a list written by MarshalBinary.
func (m *Members) UnmarshalBinary(data []byte) error {
	if err := json.Unmarshal(data, m); err != nil {
		return fmt.Errorf("the member list cannot be read: %w", err)
	}
	if m.Schema != membersSchema {
		return fmt.Errorf("the member list has schema %q, expected %q", m.Schema, membersSchema)
	}
	return nil
}

// used returns the members between two projected radii, and how many galaxies
// of the velocity window between them are not members.
func (m *Members) used(from, to float64) (members []Galaxy, rejected int) {
	for _, g := range m.Galaxies {
		switch {
		case g.Radius < from || g.Radius > to:
		case g.Member:
			members = append(members, g)
		case math.Abs(g.Velocity) <= m.Window:
			rejected++
		}
	}
	return members, rejected
}
