package output

import (
	"strconv"

	"github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/compress/snappy"
	"github.com/parquet-go/parquet-go/compress/zstd"
)

// Keys of a part's footer beside the columns' units and meanings.
const (
	keyFirst      = "panel.first_household"
	keyHouseholds = "panel.households"
	keyBlock      = "panel.block"
	keyPrecision  = "panel.precision"
)

// createdBy is the program's name in a file's footer. Its version belongs to the
// provenance.
const createdBy = "cistern"

// panelFormat is what all parts of a panel share: columns and writer options.
// Options are set by functions: the library's option structs lose fields.
type panelFormat struct {
	o       PanelOptions
	options []parquet.WriterOption
}

// PanelColumns returns the columns of a panel in their order, without values:
// name, unit and meaning of each. Kind is Int for bool columns too.
func PanelColumns(currency string) []*Column {
	year := currency + " a year"
	return []*Column{
		{Name: "household", Kind: Int, Meaning: "id of the household, from 0"},
		{Name: "group", Kind: String, Meaning: "group the household belongs to for life"},
		{Name: "age", Kind: Int, Unit: "year", Meaning: "age in this year"},
		{Name: "persistent", Kind: Float, Meaning: "persistent part z of earnings: log points, or money a year in form level"},
		{Name: "transitory", Kind: Float, Meaning: "transitory shock of the year: log points, or money a year in form level"},
		{Name: "employed", Kind: Int, Meaning: "false in a year of job loss"},
		{Name: "earnings", Kind: Float, Unit: year, Meaning: "earnings or the benefit in a year of job loss"},
		{Name: "pension", Kind: Float, Unit: year, Meaning: "public pension before tax"},
		{Name: "taxes", Kind: Float, Unit: year, Meaning: "taxes and contributions less transfers"},
		{Name: "income", Kind: Float, Unit: year, Meaning: "net income: earnings plus pension less taxes"},
		{Name: "cash_on_hand", Kind: Float, Unit: currency, Meaning: "assets with their return plus net income, before consumption"},
		{Name: "consumption", Kind: Float, Unit: year, Meaning: "consumption of the year"},
		{Name: "assets", Kind: Float, Unit: currency, Meaning: "assets at the end of the year"},
		{Name: "died", Kind: Int, Meaning: "true if the year was the household's last"},
	}
}

// newPanelFormat builds schema, encodings and footer of a panel.
func newPanelFormat(o PanelOptions) (*panelFormat, error) {
	columns := PanelColumns(o.Currency)
	meta, err := panelMetadata(o)
	if err != nil {
		return nil, err
	}
	f := &panelFormat{o: o, options: []parquet.WriterOption{
		parquet.NewSchema("panel", panelSchema(columns, o.Precision)),
		parquet.Compression(&zstd.Codec{Level: zstd.SpeedFastest}),
		parquet.WriteBufferSize(1 << 20),
		parquet.CreatedBy(createdBy, "", ""),
		parquet.SortingWriterConfig(parquet.SortingColumns(parquet.Ascending("household"), parquet.Ascending("age"))),
	}}
	for _, c := range columns {
		// In the order of households every page holds every age, so bounds of
		// money would never let a reader skip one; they cost 7 % of the time.
		if c.Kind == Float {
			f.options = append(f.options, parquet.SkipPageBounds(c.Name), parquet.SkipPageStatistics(c.Name))
		}
	}
	for k, v := range meta { // the library sorts them by key
		f.options = append(f.options, parquet.KeyValueMetadata(k, v))
	}
	return f, nil
}

// panelMetadata returns a part's footer, its households left open.
func panelMetadata(o PanelOptions) (map[string]string, error) {
	return metadata(PanelColumns(o.Currency), map[string]string{
		keyFirst: "", keyHouseholds: "",
		keyBlock: strconv.Itoa(o.Block), keyPrecision: o.Precision.String(),
	}, o.Provenance)
}

// panelSchema gives every column its type, encoding and codec, each the
// cheapest found for the kind of values in it (see BenchmarkPanelEncode):
// differences for ids and ages; a dictionary where values are few; plain zstd
// where they repeat for years (zeros, a constant pension), since split bytes
// would hide the repetition; snappy, at half the time of zstd and a twentieth
// more bytes, where they are new every year; split bytes on top for stocks,
// whose neighbours in time share their leading bytes.
func panelSchema(columns []*Column, p Precision) parquet.Node {
	number := parquet.Leaf(parquet.DoubleType)
	if p == Single {
		number = parquet.Leaf(parquet.FloatType)
	}
	nodes := make([]parquet.Node, len(columns))
	names := make([]string, len(columns))
	for i, c := range columns {
		names[i] = c.Name
		switch c.Name {
		case "household":
			nodes[i] = parquet.Encoded(parquet.Leaf(parquet.Int64Type), &parquet.DeltaBinaryPacked)
		case "age":
			nodes[i] = parquet.Encoded(parquet.Leaf(parquet.Int32Type), &parquet.DeltaBinaryPacked)
		case "group":
			nodes[i] = parquet.Encoded(parquet.String(), &parquet.RLEDictionary)
		case "employed", "died":
			nodes[i] = parquet.Leaf(parquet.BooleanType)
		case "persistent":
			nodes[i] = parquet.Encoded(number, &parquet.RLEDictionary)
		case "pension", "taxes":
			nodes[i] = number
		case "transitory", "earnings", "income":
			nodes[i] = parquet.Compressed(number, &snappy.Codec{})
		default:
			nodes[i] = parquet.Compressed(parquet.Encoded(number, &parquet.ByteStreamSplit), &snappy.Codec{})
		}
	}
	return inOrder(names, nodes)
}

// orderedGroup is a group of columns that keeps the order they are given in;
// the library's own sorts them by name.
type orderedGroup struct {
	parquet.Group
	fields []parquet.Field
}

func inOrder(names []string, nodes []parquet.Node) parquet.Node {
	g := orderedGroup{Group: parquet.Group{}}
	for i, name := range names {
		g.Group[name] = nodes[i]
	}
	byName := map[string]parquet.Field{}
	for _, f := range g.Group.Fields() {
		byName[f.Name()] = f
	}
	for _, name := range names {
		g.fields = append(g.fields, byName[name])
	}
	return &g
}

// Fields returns the columns in the order given.
func (g *orderedGroup) Fields() []parquet.Field { return g.fields }
