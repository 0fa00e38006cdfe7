package pension

// Side says which one-sided slope is meant where a law bends.
type Side int

// The two sides.
const (
	Above Side = iota // the slope just above
	Below             // the slope just below
)

// past reports whether x lies past an edge, as seen from a side of x.
func (s Side) past(x, edge float64) bool {
	if s == Below {
		return x > edge
	}
	return x >= edge
}
