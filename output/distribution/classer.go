package distribution

import (
	"slices"
	"sort"
)

// stretch is a range of keys in which a limit between classes lies, both ends
// included: one key where the limit is known.
type stretch struct{ low, high uint64 }

// classer tells the class of a key: how many limits lie below it. Most keys share
// their bin with no limit and are told by a look at a table.
type classer struct {
	stretches []stretch // ascending, apart from each other
	index     *[1 << pageBits]uint16
	pages     [][1 << subBits]uint16
}

// Classes of a key that a table cannot tell.
const (
	unclear = 1<<16 - 1 // the bin holds a limit
	noClass = 1<<16 - 2 // the key is of no number
)

// newClasser makes the tables. Stretches that are the same are one.
func newClasser(stretches []stretch) classer {
	slices.SortFunc(stretches, func(a, b stretch) int {
		if a.low < b.low {
			return -1
		} else if a.low > b.low {
			return 1
		}
		return 0
	})
	c := classer{stretches: slices.Compact(stretches), index: new([1 << pageBits]uint16)}
	at := 0 // stretches below the page
	constant := map[uint16]uint16{}
	for page := range c.index {
		first := uint64(page) << (64 - pageBits)
		last := first | (1<<(64-pageBits) - 1)
		class := uint16(at)
		if page == 0 || page == 1<<pageBits-1 {
			class = noClass
		}
		if class != noClass && at < len(c.stretches) && c.stretches[at].low <= last {
			c.index[page] = uint16(len(c.pages))
			c.pages = append(c.pages, c.page(uint64(page), &at))
			continue
		}
		id, known := constant[class]
		if !known {
			id = uint16(len(c.pages))
			constant[class] = id
			var p [1 << subBits]uint16
			for i := range p {
				p[i] = class
			}
			c.pages = append(c.pages, p)
		}
		c.index[page] = id
	}
	return c
}

// page makes the table of a page in which limits lie; at counts those below.
func (c *classer) page(page uint64, at *int) (p [1 << subBits]uint16) {
	for sub := range p {
		first := (page<<subBits | uint64(sub)) << binShift
		last := first | (1<<binShift - 1)
		for *at < len(c.stretches) && c.stretches[*at].high < first {
			*at++
		}
		p[sub] = uint16(*at)
		if *at < len(c.stretches) && c.stretches[*at].low <= last {
			p[sub] = unclear
		}
	}
	for *at < len(c.stretches) && c.stretches[*at].high>>(64-pageBits) == page {
		*at++
	}
	return p
}

// look returns the class of a key, noClass, or unclear.
func (c *classer) look(k uint64) uint16 {
	return c.pages[c.index[k>>(64-pageBits)]][k>>binShift&(1<<subBits-1)]
}

// find returns the class of a key whose bin holds a limit. open says that it lies
// in a stretch of several keys, that of the limit above the class.
func (c *classer) find(k uint64) (class int, open bool) {
	class = sort.Search(len(c.stretches), func(i int) bool { return c.stretches[i].high >= k })
	if class < len(c.stretches) {
		s := c.stretches[class]
		open = s.low < s.high && k >= s.low
	}
	return class, open
}
