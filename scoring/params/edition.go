package params

import (
	"errors"
	"fmt"
	"io/fs"
	"path"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"groundtally/assets/citedtable"
)

// ErrUnknownFactor is wrapped by the error for an id that an edition does not have.
var ErrUnknownFactor = errors.New("no such factor")

// Edition is a dated set of factors in the order of its table.
type Edition struct {
	Date    string // year and month, "2026-01"
	Factors []Factor
	index   map[string]int
}

// Get gives the factor with the id.
func (e *Edition) Get(id string) (Factor, error) {
	i, ok := e.index[id]
	if !ok {
		return Factor{}, fmt.Errorf("edition %s, %q: %w", e.Date, id, ErrUnknownFactor)
	}
	return e.Factors[i], nil
}

// Has reports whether the edition has the factor.
func (e *Edition) Has(id string) bool { _, ok := e.index[id]; return ok }

// NewEdition makes an edition; it refuses unusable factors and an id that stands twice.
func NewEdition(date string, factors []Factor) (*Edition, error) {
	e := &Edition{Date: date, Factors: factors, index: make(map[string]int, len(factors))}
	for i, f := range factors {
		if err := f.Validate(); err != nil {
			return nil, fmt.Errorf("edition %s: %w", date, err)
		}
		if _, dup := e.index[f.ID]; dup {
			return nil, fmt.Errorf("edition %s: factor %s stands twice", date, f.ID)
		}
		e.index[f.ID] = i
	}
	return e, nil
}

// With gives an edition in which one factor is replaced, for a value entered by the user.
func (e *Edition) With(f Factor) (*Edition, error) {
	i, ok := e.index[f.ID]
	if !ok {
		return nil, fmt.Errorf("edition %s, %q: %w", e.Date, f.ID, ErrUnknownFactor)
	}
	fs := slices.Clone(e.Factors)
	fs[i] = f
	return NewEdition(e.Date, fs)
}

var dated = regexp.MustCompile(`^(.+)_(\d{4})_(0[1-9]|1[0-2])\.csv$`)

// splitName takes "inventory_2026_01.csv" apart into "inventory" and "2026-01".
func splitName(name string) (family, date string, err error) {
	m := dated.FindStringSubmatch(name)
	if m == nil {
		return "", "", fmt.Errorf("parameter table %q: the name must end in _YYYY_MM.csv", name)
	}
	return m[1], m[2] + "-" + m[3], nil
}

// Dates lists the dates of the editions of a family in a folder, oldest first.
func Dates(fsys fs.FS, dir, family string) ([]string, error) {
	entries, err := fs.ReadDir(fsys, dir)
	if err != nil {
		return nil, fmt.Errorf("list parameter editions: %w", err)
	}
	var out []string
	for _, en := range entries {
		if f, d, err := splitName(en.Name()); err == nil && f == family {
			out = append(out, d)
		}
	}
	slices.Sort(out)
	return out, nil
}

// OpenTable reads the cited table of a family's edition; an empty date asks for the newest.
func OpenTable(fsys fs.FS, dir, family, date string) (*citedtable.Table, error) {
	if date == "" {
		ds, err := Dates(fsys, dir, family)
		if err != nil {
			return nil, err
		}
		if len(ds) == 0 {
			return nil, fmt.Errorf("parameter family %q: no edition in %q", family, dir)
		}
		date = ds[len(ds)-1]
	}
	return citedtable.ParseFS(fsys, path.Join(dir, family+"_"+strings.ReplaceAll(date, "-", "_")+".csv"))
}

// ParseEdition reads a table of factors whose name ends in _YYYY_MM.csv, with the columns
// id,technology,account,boundary,unit,low,central,high,dist,group,year.
func ParseEdition(t *citedtable.Table) (*Edition, error) {
	_, date, err := splitName(t.Name)
	if err != nil {
		return nil, err
	}
	if err := need(t, "id", "technology", "account", "boundary", "unit", "low", "central", "high", "dist", "group", "year"); err != nil {
		return nil, err
	}
	factors := make([]Factor, 0, len(t.Rows))
	for _, r := range t.Rows {
		f := Factor{ID: r.Text("id"), Unit: r.Text("unit"), Dist: Dist(r.Text("dist")), Group: r.Text("group"),
			Boundary: Boundary(r.Text("boundary")), Account: Account(r.Text("account")),
			Technology: r.Text("technology"), Source: r.Source, Provenance: r.Provenance}
		if err := numbers(r, "", &f); err != nil {
			return nil, err
		}
		factors = append(factors, f)
	}
	return NewEdition(date, factors)
}

func need(t *citedtable.Table, columns ...string) error {
	for _, c := range columns {
		if !t.Has(c) {
			return fmt.Errorf("parameter table %s: no column %s", t.Name, c)
		}
	}
	return nil
}

func numbers(r citedtable.Row, prefix string, f *Factor) error {
	var err error
	if f.Low, err = r.Float(prefix + "low"); err != nil {
		return err
	}
	if f.Central, err = r.Float(prefix + "central"); err != nil {
		return err
	}
	if f.High, err = r.Float(prefix + "high"); err != nil {
		return err
	}
	if y := r.Text("year"); y != "" {
		if f.Year, err = strconv.Atoi(y); err != nil {
			return fmt.Errorf("factor %s: year %q is not a whole number", f.ID, y)
		}
	}
	return nil
}

// Basis says what one unit of an inventory item is.
type Basis string

// The bases of inventory items.
const (
	PerKW         Basis = "kW"                          // rated kilowatt of wind
	PerKWp        Basis = "kWp"                         // direct-current kilowatt of solar
	PerKWac       Basis = "kW_ac"                       // alternating-current kilowatt of inverter
	PerKVA        Basis = "kVA"                         // kilovolt-ampere of transformer
	PerKm         Basis = "km"                          // kilometre of track, cable or line
	PerTurbine    Basis = "turbine"                     // one turbine
	PerSubstation Basis = "substation"                  // one switchgear with its building
	PerM2Module   Basis = "m2 module"                   // square metre of panel
	PerHa         Basis = "ha"                          // hectare
	PerKg         Basis = "kg"                          // kilogram of material
	PerLitre      Basis = "L"                           // litre of fuel
	PerTKm        Basis = "t km"                        // tonne carried one kilometre
	CapitalYear   Basis = "share of generator per year" // share of the generator rows, each year
	CapitalOnce   Basis = "share of generator once"     // share of the generator rows, once in the life
)

var bases = map[Basis]bool{PerKW: true, PerKWp: true, PerKWac: true, PerKVA: true, PerKm: true, PerTurbine: true,
	PerSubstation: true, PerM2Module: true, PerHa: true, PerKg: true, PerLitre: true, PerTKm: true, CapitalYear: true, CapitalOnce: true}

// Share reports whether the item is a share of the generator rows and not an amount of its own.
func (b Basis) Share() bool { return b == CapitalYear || b == CapitalOnce }

// Item is a thing that goes into a plant, with what it costs in two accounts. Both factors share their
// group, so a trial that makes the steel dear in energy makes it dear in emissions too.
//
// Generator marks the rows that upkeep and dismantling are a share of.
type Item struct {
	ID, Technology string
	Boundary       Boundary
	Basis          Basis
	Generator      bool
	Energy         Factor // MJ primary per basis, id "<id>.mj"
	Climate        Factor // kg CO2e per basis, id "<id>.kgco2e"
}

// AppliesTo reports whether the item belongs to a technology of the program.
func (it Item) AppliesTo(technology string) bool { return applies(it.Technology, technology) }

// Inventory is a dated list of items.
type Inventory struct {
	Date    string
	Items   []Item
	Edition *Edition // the factors of all items, two per item
	index   map[string]int
}

// Get gives the item with the id.
func (inv *Inventory) Get(id string) (Item, error) {
	i, ok := inv.index[id]
	if !ok {
		return Item{}, fmt.Errorf("inventory %s, %q: %w", inv.Date, id, ErrUnknownFactor)
	}
	return inv.Items[i], nil
}

// ParseInventory reads a table whose name ends in _YYYY_MM.csv, with the columns
// id,technology,boundary,basis,generator,mj_low,mj_central,mj_high,kgco2e_low,kgco2e_central,kgco2e_high,dist,group,year.
// For a basis that is a share, the numbers are shares in place of MJ and kg.
func ParseInventory(t *citedtable.Table) (*Inventory, error) {
	_, date, err := splitName(t.Name)
	if err != nil {
		return nil, err
	}
	if err := need(t, "id", "technology", "boundary", "basis", "generator", "mj_low", "mj_central", "mj_high",
		"kgco2e_low", "kgco2e_central", "kgco2e_high", "dist", "group", "year"); err != nil {
		return nil, err
	}
	inv := &Inventory{Date: date, index: map[string]int{}}
	var all []Factor
	for _, r := range t.Rows {
		it := Item{ID: r.Text("id"), Technology: r.Text("technology"), Boundary: Boundary(r.Text("boundary")), Basis: Basis(r.Text("basis"))}
		if !bases[it.Basis] {
			return nil, fmt.Errorf("parameter table %s, line %d: basis %q is not known", t.Name, r.Line, it.Basis)
		}
		switch r.Text("generator") {
		case "yes":
			it.Generator = true
		case "no":
		default:
			return nil, fmt.Errorf("parameter table %s, line %d: generator must be yes or no", t.Name, r.Line)
		}
		f := Factor{Dist: Dist(r.Text("dist")), Group: r.Text("group"), Boundary: it.Boundary, Technology: it.Technology, Source: r.Source, Provenance: r.Provenance}
		it.Energy, it.Climate = f, f
		it.Energy.ID, it.Energy.Account, it.Energy.Unit = it.ID+".mj", EnergyAccount, "MJ/"+string(it.Basis)
		it.Climate.ID, it.Climate.Account, it.Climate.Unit = it.ID+".kgco2e", ClimateAccount, "kg CO2e/"+string(it.Basis)
		if it.Basis.Share() {
			it.Energy.Unit, it.Climate.Unit = string(it.Basis), string(it.Basis)
		}
		if err := numbers(r, "mj_", &it.Energy); err != nil {
			return nil, err
		}
		if err := numbers(r, "kgco2e_", &it.Climate); err != nil {
			return nil, err
		}
		inv.index[it.ID] = len(inv.Items)
		inv.Items = append(inv.Items, it)
		all = append(all, it.Energy, it.Climate)
	}
	if inv.Edition, err = NewEdition(date, all); err != nil {
		return nil, err
	}
	return inv, nil
}
