package configs

import "cistern/policy"

// Cost is what a run is expected to take.
type Cost struct {
	HouseholdYears float64
	NodeUpdates    float64 // evaluations of next year's rule in solving, twins aside
	Seconds        float64 // on the given number of workers
	MemoryBytes    float64
	DiskBytes      float64
}

// Rates of a run, measured on a 2.8 GHz server processor with the built-in
// scenarios; another machine is within a factor of two or three.
const (
	secondsPerUpdate   = 15e-9
	secondsPerRow      = 750e-9 // simulation, twins and all passes of the summary
	secondsPerRowFile  = 350e-9 // encoding, compressing and writing a row
	bytesPerRowDouble  = 40
	bytesPerRowSingle  = 20
	bytesPerRule       = 112 // a node of a rule and of its table
	bytesPerWorker     = 70 << 20
	bytesFixed         = 320 << 20
	kinkNodes          = 1.4 // nodes of a cubic rule over those of the fixed grid
	bytesPerPolicyNode = 40

	secondsPerPass       = 60e-9 // simulation of a household-year and a look at it
	secondsPerSecondLife = 40e-9 // of a household-year lived with a transfer
)

// Cost estimates a run on a number of workers.
func (sc *Scenario) Cost(workers int) Cost {
	workers = max(workers, 1)
	c := Cost{MemoryBytes: bytesFixed + float64(workers)*bytesPerWorker}
	nodes := 0.0
	for _, p := range sc.Problems() {
		h := p.Household
		alive, years := 1.0, 0.0
		for _, s := range h.Survival {
			years += alive
			alive *= s
		}
		g := sc.Groups[p.Group]
		households := float64(sc.Households) * g.Share / float64(len(g.Discounts))
		c.HouseholdYears += households * years
		if t := sc.Experiments.Transfer; t != nil {
			c.Seconds += households * t.secondLife(h) * secondsPerSecondLife / float64(workers)
		}
		points := float64(sc.Solver.AssetPoints)
		if sc.Solver.Interpolation == policy.Cubic {
			points *= kinkNodes
		}
		_, outcomes := h.Income(0, 0)
		perAge := points * float64(h.Nodes())
		c.NodeUpdates += perAge * (float64(h.WorkingYears())*float64(len(outcomes)) + float64(h.Years()-h.WorkingYears()))
		nodes += perAge * float64(h.Years())
	}
	c.MemoryBytes += nodes * bytesPerRule
	perRow := secondsPerRow
	if sc.Panel.Write {
		perRow += secondsPerRowFile
		bytes := float64(bytesPerRowDouble)
		if sc.Panel.Precision == "single" {
			bytes = bytesPerRowSingle
		}
		c.DiskBytes += c.HouseholdYears * bytes
	}
	c.DiskBytes += nodes * bytesPerPolicyNode
	if t := sc.Experiments.Transfer; t != nil {
		perRow += 2 * secondsPerPass // wealth, response; with many households a few more
		c.MemoryBytes += nodes*bytesPerRule/2 + t.bytes(len(sc.Groups), workers)
	}
	if d := sc.Experiments.Decomposition; d != nil {
		passes, problems := d.passes(sc.LastAge - sc.FirstAge + 1)
		share := 1.0
		if d.Households > 0 {
			share = min(1, float64(d.Households)/float64(sc.Households))
		}
		perRow += share * passes * secondsPerPass
		c.Seconds += problems * c.NodeUpdates * secondsPerUpdate / float64(workers)
		c.MemoryBytes += nodes * bytesPerRule
		if problems > 1 { // rules of a few lengths of life at a time
			c.MemoryBytes += nodes * bytesPerRule * float64(workers) / float64(len(sc.Problems()))
		}
	}
	c.Seconds += (c.NodeUpdates*secondsPerUpdate + c.HouseholdYears*perRow) / float64(workers)
	return c
}
