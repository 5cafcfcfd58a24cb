package cosmology_test

import (
	"fmt"

	"steelyard/probes/cosmology"
)

func ExampleNew() {
	p := cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, W0: -1}
	c, err := cosmology.New(p.Flat())
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("an arcminute at z = 0.25 spans %.1f kpc\n", 60*c.KpcPerArcsec(0.25))
	fmt.Printf("a source at z = 1 is lensed with %.3f of the strength at infinity\n", c.Efficiency(0.25, 1)/c.EfficiencyInfinity(0.25))
	// Output:
	// an arcminute at z = 0.25 spans 234.6 kpc
	// a source at z = 1 is lensed with 0.748 of the strength at infinity
}
