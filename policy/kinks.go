package policy

import "cmp"

// kink is a node of a rule whose slope jumps.
type kink struct {
	cash        float64
	consumption float64
	jump        float64 // slope from below less slope from above
	first       bool    // where the rule's own limit stops binding
}

// sighting is a kink of next year's rule seen from this year: the assets that
// lead to it through one persistent node and one income outcome.
type sighting struct {
	assets      float64
	consumption float64 // next year's, at the kink
	delta       float64 // the jump of the slope; later what the slope sum lacks on the left of the kink
	weight      float64 // probability of the outcome
	node        int32   // next year's persistent node
	index       int32   // where it came to stand on the asset grid
}

func bySighting(a, b sighting) int {
	if c := cmp.Compare(a.assets, b.assets); c != 0 {
		return c
	}
	return cmp.Compare(a.node, b.node)
}

// mergeAssets appends to dst the fixed grid bottom + offsets together with the
// sighted kinks above the bottom, in order, points closer than tolerance taken
// as one, and notes in every sighting where it stands (−1: below the bottom).
func mergeAssets(dst []float64, bottom float64, offsets []float64, kinks []sighting, tolerance float64) []float64 {
	k := 0
	for k < len(kinks) && kinks[k].assets <= bottom+tolerance {
		kinks[k].index = -1
		k++
	}
	for i, g := range offsets {
		a := bottom + g
		for ; k < len(kinks) && kinks[k].assets <= a+tolerance; k++ {
			x := kinks[k].assets
			last := dst[len(dst)-1] // the bottom is there: kinks lie above it
			switch {
			case x-last <= tolerance:
			case a-x <= tolerance && i < len(offsets):
				if last < a {
					dst = append(dst, a)
				}
			default:
				dst = append(dst, x)
			}
			kinks[k].index = int32(len(dst) - 1)
		}
		if len(dst) == 0 || a-dst[len(dst)-1] > tolerance {
			dst = append(dst, a)
		}
	}
	for ; k < len(kinks); k++ {
		kinks[k].index = -1 // above the top of the grid
	}
	return dst
}
