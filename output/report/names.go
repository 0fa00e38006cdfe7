package report

import "math"

// name is the name of a line where it stands on a chart.
type name struct {
	left, right, top, bottom float64
	text                     string
	style                    int
}

// distance is how far a point lies from the rectangle of a name; 0 inside.
func (n *name) distance(p point) float64 {
	dx := math.Max(0, math.Max(n.left-p.x, p.x-n.right))
	dy := math.Max(0, math.Max(n.top-p.y, p.y-n.bottom))
	return math.Hypot(dx, dy)
}

// Distances of names, in units of a chart.
const (
	trail   = 5.0  // between the points that stand for a line
	off     = 4.0  // of a name above or below its line
	near    = 2.5  // of a name's corner from a steep line, both ways
	clear   = 10.0 // least distance of a name from other lines
	content = 36.0 // beyond it more distance is worth nothing
)

// besideLines finds a place for the name of every line: beside it, and so far from
// the others that it can belong to none of them. It returns nil where there is no
// such place for one of them, an empty list where nothing has a name.
func besideLines(v *View, b *box) []name {
	lines := make([][]point, len(v.Series))
	for i := range v.Series {
		lines[i] = trailOf(&v.Series[i], b)
	}
	names := []name{}
	for i := range v.Series {
		s := &v.Series[i]
		if s.Label == "" {
			continue
		}
		n, ok := besideLine(lines, i, names, s, b)
		if !ok {
			return nil
		}
		names = append(names, n)
	}
	return names
}

// trailOf is a line as points close to each other.
func trailOf(s *Series, b *box) []point {
	var list []point
	if s.Y == nil || s.Dots {
		return nil
	}
	last, known := point{}, false
	for k, x := range s.X {
		if !finite(s.Y[k]) {
			known = false
			continue
		}
		at := point{b.x.at(x), b.y.at(s.Y[k])}
		if known {
			steps := math.Max(1, math.Ceil(math.Hypot(at.x-last.x, at.y-last.y)/trail))
			for j := 1.0; j < steps; j++ {
				list = append(list, point{last.x + (at.x-last.x)*(j/steps), last.y + (at.y-last.y)*(j/steps)})
			}
		}
		list = append(list, at)
		last, known = at, true
	}
	return list
}

func besideLine(lines [][]point, own int, taken []name, s *Series, b *box) (best name, ok bool) {
	w, h := advance(s.Label), textSize
	most := math.Inf(-1)
	for k := 0; k < len(lines[own]); k += 2 {
		p := lines[own][k]
		for side, n := range []name{
			{left: p.x - w/2, right: p.x + w/2, top: p.y - off - h, bottom: p.y - off},
			{left: p.x - w/2, right: p.x + w/2, top: p.y + off, bottom: p.y + off + h},
			{left: p.x - near - w, right: p.x - near, top: p.y - near - h, bottom: p.y - near},
			{left: p.x + near, right: p.x + near + w, top: p.y - near - h, bottom: p.y - near},
			{left: p.x + near, right: p.x + near + w, top: p.y + near, bottom: p.y + near + h},
			{left: p.x - near - w, right: p.x - near, top: p.y + near, bottom: p.y + near + h},
		} {
			if n.left < b.x.from+2 || n.right > width-2 || n.top < b.y.to || n.bottom > b.y.from-2 {
				continue
			}
			room := clearance(&n, lines, own, taken)
			if worth := math.Min(room, content) - 2*float64(side/2); room >= clear && worth > most {
				n.text, n.style = s.Label, s.Style
				best, most, ok = n, worth, true
			}
		}
	}
	return best, ok
}

// clearance is how far a name is from other lines and names; nothing where it lies
// on its own line.
func clearance(n *name, lines [][]point, own int, taken []name) float64 {
	room := math.Inf(1)
	for i, line := range lines {
		for _, p := range line {
			d := n.distance(p)
			if i != own {
				room = math.Min(room, d)
			} else if d < near {
				return 0
			}
		}
		if room < clear {
			return 0
		}
	}
	for _, t := range taken {
		if n.left < t.right+6 && n.right > t.left-6 && n.top < t.bottom+3 && n.bottom > t.top-3 {
			return 0
		}
	}
	return room
}
