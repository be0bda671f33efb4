package draw

// Point is a place on a scene in its own units, x to the right, y down.
type Point struct{ X, Y float64 }

// Style says how a shape is painted. Empty colours are not painted.
type Style struct {
	Fill   string // "#rrggbb"
	Stroke string
	Width  float64
	Dash   string // lengths of dash and gap, "4 3"
	Hatch  bool   // hatching means unknown, nothing else
}

// Path is a set of rings or lines. Closed rings are filled by the even-odd rule, so holes stay open.
type Path struct {
	Rings  [][]Point
	Closed bool
	Style  Style
	Item   string // what the shape stands for, for hit-testing
	Title  string // shown when the pointer rests on it
}

// Anchor says which end of a text its place is.
type Anchor string

// The anchors.
const (
	Start  Anchor = "start"
	Middle Anchor = "middle"
	End    Anchor = "end"
)

// Text is one line of text.
type Text struct {
	At     Point
	Text   string
	Size   float64
	Colour string
	Bold   bool
	Anchor Anchor
	Halo   bool // a thin edge of paper colour, for names on a map
}

// Scene is a picture in painting order.
type Scene struct {
	Width, Height float64
	Title         string // for readers who cannot see it
	ID            string // tells its hatching from that of other scenes on one page
	Items         []any  // Path or Text
}

// Path adds a path.
func (s *Scene) Path(p Path) { s.Items = append(s.Items, p) }

// Text adds a text.
func (s *Scene) Text(t Text) {
	if t.Anchor == "" {
		t.Anchor = Start
	}
	s.Items = append(s.Items, t)
}

// Rect adds a box.
func (s *Scene) Rect(x, y, w, h float64, st Style, title string) {
	s.Bar(x, y, w, h, st, "", title)
}

// Bar adds a box that stands for an item, with the words shown when the pointer rests on it.
func (s *Scene) Bar(x, y, w, h float64, st Style, item, title string) {
	s.Path(Path{Rings: [][]Point{{{x, y}, {x + w, y}, {x + w, y + h}, {x, y + h}}}, Closed: true, Style: st, Item: item, Title: title})
}

// Line adds a line.
func (s *Scene) Line(st Style, pts ...Point) { s.Path(Path{Rings: [][]Point{pts}, Style: st}) }
