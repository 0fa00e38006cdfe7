package sim

import "fmt"

// Columns says which columns of a block are filled beside those that simulation
// needs (CashOnHand, Consumption, Assets, Income).
type Columns uint

// The optional columns of a Block.
const (
	Identity   Columns = 1 << iota // Household
	Order                          // Position
	States                         // Node, Persistent
	Shocks                         // Transitory, Employed
	Sources                        // Earnings, Pension, Taxes
	Fates                          // Died
	Propensity                     // Propensity, AtLimit
	Twins                          // TwinAssets, TwinConsumption
	Changes                        // LastAssets, LastConsumption, JobLost
	All        Columns = 1<<iota - 1
)

// underEvent marks the columns of an event. It is set where there is one.
const underEvent Columns = 1 << 31

// Run is a stretch of rows with one year and type: From ≤ row < To.
type Run struct {
	T, Type, Group int // year from the first age, type, group
	Year           int // calendar year, under an [Event]; 0 without
	From, To       int
}

// Block is every row of Unit consecutive households (fewer in the last block):
// one for each household and year alive. Rows are ordered by type, then year;
// Position tells the place in the order household, year. Columns that were not
// asked for are empty. Money is in the scenario's currency unit, flows a year.
//
// Within a run households are in no particular order. A Block is only valid
// until the function that work returned for it has run.
type Block struct {
	First      int64 // id of the first household
	Households int
	N          int   // rows
	Runs       []Run // covering 0 … N in order

	Household       []int64
	Position        []int32
	Node            []uint8
	Persistent      []float64 // z
	Transitory      []float64 // ε; 0 in years of job loss and in retirement
	Employed        []bool    // worked this year
	Earnings        []float64 // from work, or the benefit in a year of job loss
	Pension         []float64
	Taxes           []float64
	Income          []float64 // net
	CashOnHand      []float64
	Consumption     []float64
	Assets          []float64 // at the end of the year
	Died            []bool    // at the end of the year
	Propensity      []float64 // marginal propensity to consume
	AtLimit         []bool    // the borrowing limit binds
	TwinAssets      []float64 // of the certain twin; NaN where the type has none
	TwinConsumption []float64
	LastAssets      []float64 // at the end of last year; in the first year those it began with
	LastConsumption []float64 // last year's; NaN in a household's first year
	JobLost         []bool    // earnings are lost this year

	// Under an Event only, for every row: the same household, with the same draws,
	// under the event.
	EventIncome      []float64
	EventConsumption []float64
	EventAssets      []float64
	EventJobLost     []bool    // where JobLost is filled
	Lowest           []float64 // the lowest assets that the borrowing limit allows, −Inf without limit
	EventLowest      []float64
}

// resize makes room for n rows in the columns that are wanted.
func (b *Block) resize(n int, want Columns) {
	float := func(c *[]float64, with Columns) {
		if want&with != 0 {
			*c = grow(*c, n)
		}
	}
	b.CashOnHand, b.Consumption = grow(b.CashOnHand, n), grow(b.Consumption, n)
	b.Assets, b.Income = grow(b.Assets, n), grow(b.Income, n)
	if want&Identity != 0 {
		b.Household = grow(b.Household, n)
	}
	if want&Order != 0 {
		b.Position = grow(b.Position, n)
	}
	if want&States != 0 {
		b.Node = grow(b.Node, n)
	}
	if want&Shocks != 0 {
		b.Employed = grow(b.Employed, n)
	}
	if want&Fates != 0 {
		b.Died = grow(b.Died, n)
	}
	if want&Propensity != 0 {
		b.AtLimit = grow(b.AtLimit, n)
	}
	if want&Changes != 0 {
		b.JobLost = grow(b.JobLost, n)
	}
	float(&b.Persistent, States)
	float(&b.Transitory, Shocks)
	float(&b.Earnings, Sources)
	float(&b.Pension, Sources)
	float(&b.Taxes, Sources)
	float(&b.Propensity, Propensity)
	float(&b.TwinAssets, Twins)
	float(&b.TwinConsumption, Twins)
	float(&b.LastAssets, Changes)
	float(&b.LastConsumption, Changes)
	float(&b.EventIncome, underEvent)
	float(&b.EventConsumption, underEvent)
	float(&b.EventAssets, underEvent)
	float(&b.Lowest, underEvent)
	float(&b.EventLowest, underEvent)
	if want&underEvent != 0 && want&Changes != 0 {
		b.EventJobLost = grow(b.EventJobLost, n)
	}
}

// grow returns a slice of length n that begins with x's entries.
func grow[E any](x []E, n int) []E {
	if cap(x) >= n {
		return x[:n]
	}
	y := make([]E, n, n+n/8)
	copy(y, x)
	return y
}

// A StateError is a household in a state that the model does not allow, such as
// consumption at or below what its utility can bear.
type StateError struct {
	Group       string
	Age         int
	Household   int64
	Twin        bool    // it is the household's certain twin
	Event       bool    // it is the household under the event
	Cash        float64 // money
	Consumption float64 // money
}

func (e *StateError) Error() string {
	who := ""
	if e.Twin {
		who = "the certain twin of "
	}
	why := "its start assets or income can fall lower than its borrowing limit or subsistence reckons with"
	if e.Event {
		why = "under the event its income or assets fall lower than its borrowing limit or subsistence reckons with"
	}
	return fmt.Sprintf("sim: %shousehold %d (group %s) at age %d has cash-on-hand %.6g and would consume %.6g, which its utility does not allow: %s",
		who, e.Household, e.Group, e.Age, e.Cash, e.Consumption, why)
}
