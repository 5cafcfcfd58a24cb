package halo_test

import (
	"fmt"

	"steelyard/probes/cosmology"
	"steelyard/probes/halo"
)

func ExampleConvert() {
	c, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1})
	if err != nil {
		fmt.Println(err)
		return
	}
	const z = 0.25
	h := halo.NewNFW(8e14, 4.5, 200*c.CriticalDensity(z))
	for _, d := range []halo.Definition{{Delta: 2500, Of: "critical"}, {Delta: 500, Of: "critical"}, {Delta: 200, Of: "mean"}, {Of: "virial"}} {
		mass, radius, err := halo.Convert(h, d, c, z)
		if err != nil {
			fmt.Println(err)
			return
		}
		fmt.Printf("%-6s %.3e Msun inside %4.0f kpc\n", d, mass, radius)
	}
	// Output:
	// 2500c  2.419e+14 Msun inside  509 kpc
	// 500c   5.666e+14 Msun inside 1157 kpc
	// 200m   1.019e+15 Msun inside 2481 kpc
	// virial 9.374e+14 Msun inside 2192 kpc
}
