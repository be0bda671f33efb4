package geotiff

import (
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode"

	"groundtally/geo"
)

// Kind says what the cells of a file are.
type Kind uint8

// The kinds. Coloured are whole numbers with a colour for each: kinds of land cover as likely as a
// scanned map.
const (
	Values Kind = iota
	Coloured
	Picture
)

func (k Kind) String() string { return [...]string{"values", "values with colours", "picture"}[k] }

// Header is what the header of a file says.
type Header struct {
	Cols, Rows  int
	Bands       int
	Kind        Kind
	Sample      string // "Byte", "Int16", "Float32"
	Compression string // "none", "LZW", "Deflate" or one that is not read
	Big         bool   // offsets of 8 bytes
	Planar      bool   // each band apart

	CRS            string // "EPSG:25832"; empty where the file gives no code
	Citation       string // the file's own words for its reference system
	HorizontalUnit string // "metre", "foot", "US survey foot"; empty where not stated
	VerticalCRS    string
	VerticalUnit   string
	VerticalToM    float64 // metres in a VerticalUnit; 0 where not known

	// Placed says that the file gives its place: the cell corner at column c, row r, counted from the
	// upper left, is at x = T[0]+c*T[1]+r*T[2], y = T[3]+c*T[4]+r*T[5].
	Placed    bool
	Transform [6]float64

	NoData        float64
	HasNoData     bool
	Scale, Offset float64 // value = stored * Scale + Offset

	Refused error // why Decode does not read the file, as far as the header tells
	Notices []geo.Notice
}

// Extent gives the box around the corners of the image, in units of the reference system.
func (h *Header) Extent() (minX, minY, maxX, maxY float64) {
	minX, minY, maxX, maxY = math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)
	for _, c := range [4][2]float64{{0, 0}, {float64(h.Cols), 0}, {0, float64(h.Rows)}, {float64(h.Cols), float64(h.Rows)}} {
		t := h.Transform
		x, y := t[0]+c[0]*t[1]+c[1]*t[2], t[3]+c[0]*t[4]+c[1]*t[5]
		minX, minY, maxX, maxY = min(minX, x), min(minY, y), max(maxX, x), max(maxY, y)
	}
	return minX, minY, maxX, maxY
}

func (h *Header) southUp() bool { return h.Transform[5] > 0 }

type sampleKind uint8

const (
	unsigned sampleKind = 1 + iota
	signed
	floating
)

// A header is what is public with what finds the cells.
type header struct {
	Header
	name string // of the file, for notices
	img  image

	sample      sampleKind
	width       int // bytes of a sample
	samples     int // in a cell of a block: all bands when they are chunky, else 1
	predictor   uint64
	compression uint64
	tiled       bool

	blockW, blockH int
	across, down   int
	rowBytes       int // of a block
}

func (h *header) note(code string, s geo.Severity, args ...string) {
	n := geo.Notice{Code: code, Severity: s, File: h.name}
	for i := 0; i+1 < len(args); i += 2 {
		if n.Args == nil {
			n.Args = map[string]string{}
		}
		n.Args[args[i]] = args[i+1]
	}
	h.Notices = append(h.Notices, n)
}

// refuse keeps the first reason for which the file is not read.
func (h *header) refuse(code, what, do string) {
	if h.Refused == nil {
		h.Refused = fault(code, "", what, do)
	}
}

const (
	compressionNone       = 1
	compressionLZW        = 5
	compressionDeflate    = 8
	compressionOldDeflate = 32946
)

var compressionNames = map[uint64]string{
	compressionNone: "none", compressionLZW: "LZW", compressionDeflate: "Deflate", compressionOldDeflate: "Deflate",
	2: "CCITT", 3: "CCITT fax 3", 4: "CCITT fax 4", 6: "JPEG", 7: "JPEG", 32773: "PackBits",
	34712: "JPEG 2000", 34887: "LERC", 34925: "LZMA", 50000: "ZSTD", 50001: "WEBP", 50002: "JPEG XL",
}

// header reads what the file says of its first full image.
func (f *file) header(o Options) (*header, error) {
	img, further, mask, err := f.images()
	if err != nil {
		return nil, err
	}
	h := &header{name: o.File, img: img}
	h.Big = f.big
	for _, step := range []func(*header, Options) error{f.cells, f.layout, f.place, f.geoKeys, f.noData, f.metadata} {
		if err := step(h, o); err != nil {
			return nil, err
		}
	}
	if further > 0 {
		h.note("images_left_out", geo.Warning, "count", strconv.Itoa(further))
	}
	if mask {
		h.note("mask_left_out", geo.Warning)
	}
	if h.Bands > 1 {
		h.note("bands_left_out", geo.Warning, "count", strconv.Itoa(h.Bands-1), "of", strconv.Itoa(h.Bands))
	}
	if h.Kind == Coloured {
		h.note("values_with_colours", geo.Warning)
	}
	if h.Scale != 1 || h.Offset != 0 {
		h.note("values_scaled", geo.Info, "scale", strconv.FormatFloat(h.Scale, 'g', -1, 64), "offset", strconv.FormatFloat(h.Offset, 'g', -1, 64))
	}
	if h.VerticalUnit != "" && h.VerticalUnit != metre {
		to := strconv.FormatFloat(h.VerticalToM, 'g', -1, 64)
		switch {
		case h.VerticalToM == 0:
			h.note("vertical_unit_unknown", geo.Warning, "unit", h.VerticalUnit)
		case o.Metres:
			h.note("values_to_metres", geo.Info, "unit", h.VerticalUnit, "metres", to)
		default:
			h.note("values_not_metres", geo.Warning, "unit", h.VerticalUnit, "metres", to)
		}
	}
	return h, nil
}

// An asker reads one number after the other and keeps the first error.
type asker struct {
	f   *file
	img image
	err error
}

func (a *asker) number(tag uint16, otherwise uint64) uint64 {
	if a.err != nil {
		return otherwise
	}
	n, err := a.f.number(a.img, tag, otherwise)
	a.err = err
	return n
}

// side reads a number of columns or rows, which must be 1 to 2^31-1.
func (a *asker) side(tag uint16, what string) int {
	n := a.number(tag, 0)
	if a.err == nil && (n < 1 || n > math.MaxInt32) {
		a.err = fault("bad_header", fmt.Sprintf("tag %d", tag), fmt.Sprintf("the file states %d %s", n, what), doCopy)
	}
	return int(n)
}

const (
	photometricRGB     = 2
	photometricPalette = 3
)

// cells reads how many cells there are and what numbers they hold.
func (f *file) cells(h *header, _ Options) error {
	a := asker{f: f, img: h.img}
	h.Cols, h.Rows = a.side(tagWidth, "columns"), a.side(tagHeight, "rows")
	bands := a.number(tagSamples, 1)
	format := a.number(tagFormat, 1)
	colours := a.number(tagPhotometric, 1)
	h.compression = a.number(tagCompression, compressionNone)
	planar := a.number(tagPlanar, 1)
	fill := a.number(tagFillOrder, 1)
	if a.err != nil {
		return a.err
	}
	if bands < 1 || bands > math.MaxUint16 {
		return fault("bad_header", fmt.Sprintf("tag %d", tagSamples), fmt.Sprintf("the file states %d bands", bands), doCopy)
	}
	h.Bands = int(bands)
	if planar != 1 && planar != 2 {
		return fault("bad_header", fmt.Sprintf("tag %d", tagPlanar), fmt.Sprintf("the order of the bands is %d, not 1 or 2", planar), doCopy)
	}
	h.Planar = planar == 2 && bands > 1
	depths, err := f.numbers(h.img, tagBits, bands)
	if err != nil {
		return err
	}
	bits, even := uint64(1), true
	for i := range depths.len() {
		if i == 0 {
			bits = depths.at(i)
		}
		even = even && depths.at(i) == bits
	}
	switch format {
	case 1, 4: // 4 is stated by programs that do not say; others take it as 1 too
		h.sample = unsigned
	case 2:
		h.sample = signed
	case 3:
		h.sample = floating
	}
	h.Sample = sampleName(h.sample, bits)
	h.width = int(min(bits, 64) / 8)
	h.samples = h.Bands
	if h.Planar {
		h.samples = 1
	}

	switch {
	case colours == photometricRGB && h.sample == unsigned && bits <= 16, colours == photometricPalette && bands >= 3, colours >= 5 && colours <= 10:
		h.Kind = Picture
		h.refuse("picture", "this is a picture, not a grid of values", "choose a file of heights or other values")
	case colours == photometricPalette:
		h.Kind = Coloured
	}
	name, known := compressionNames[h.compression]
	if !known {
		name = fmt.Sprintf("compression %d", h.compression)
	}
	h.Compression = name
	switch h.compression {
	case compressionNone, compressionLZW, compressionDeflate, compressionOldDeflate:
	default:
		h.refuse("compression", name+" compression is not read", doDeflate)
	}
	switch {
	case h.sample == 0:
		h.refuse("sample", h.Sample+" are not read", doGrid)
	case !even:
		h.refuse("sample", "the bands have numbers of different depths", "save the first band alone")
	case h.sample == floating && bits != 32 && bits != 64, h.sample != floating && bits != 8 && bits != 16 && bits != 32:
		what := "whole numbers"
		if h.sample == floating {
			what = "floating-point numbers"
		}
		h.refuse("sample", fmt.Sprintf("%s of %d bits are not read", what, bits), doGrid)
	case fill != 1:
		h.refuse("sample", "the bits of each byte stand in reverse order", doGrid)
	}
	return nil
}

// Bounds of a block. Blocks are read row by row, so only a row takes memory.
const (
	maxRowBytes   = 16 << 20
	maxTileSide   = 1 << 16
	maxBlockBytes = 1 << 40
)

// layout reads how the cells are cut into strips or tiles.
func (f *file) layout(h *header, o Options) error {
	a := asker{f: f, img: h.img}
	h.predictor = a.number(tagPredictor, 1)
	_, h.tiled = h.img[tagTileWidth]
	if h.tiled {
		h.blockW, h.blockH = a.side(tagTileWidth, "columns of a tile"), a.side(tagTileHeight, "rows of a tile")
	} else {
		h.blockW, h.blockH = h.Cols, h.Rows
		if n := a.number(tagRowsPerStrip, math.MaxUint32); n == 0 {
			return fault("bad_header", fmt.Sprintf("tag %d", tagRowsPerStrip), "the file states strips without rows", doCopy)
		} else if n < uint64(h.Rows) {
			h.blockH = int(n)
		}
	}
	if a.err != nil {
		return a.err
	}
	if h.compression == compressionNone {
		h.predictor = 1
	}
	if h.predictor < 1 || h.predictor > 3 || h.predictor == 3 && h.sample != floating {
		h.refuse("predictor", fmt.Sprintf("predictor %d is not read for these numbers", h.predictor), doDeflate)
	}
	row := int64(h.blockW) * int64(h.samples) * int64(max(h.width, 1)) // below 2^50
	if row > maxRowBytes || h.tiled && (h.blockW > maxTileSide || h.blockH > maxTileSide) || row*int64(h.blockH) > maxBlockBytes {
		h.refuse("block_too_large", fmt.Sprintf("a block of the file has %d by %d cells, more than can be read", h.blockW, h.blockH), "save it again in tiles of 256 by 256")
	}
	h.rowBytes = int(min(row, maxRowBytes))
	h.across, h.down = (h.Cols-1)/h.blockW+1, (h.Rows-1)/h.blockH+1
	if int64(h.Cols)*int64(h.Rows) > int64(o.MaxCells) {
		h.refuse("too_many", fmt.Sprintf("the grid has %d by %d cells, at most %d can be read", h.Cols, h.Rows, o.MaxCells), doCut)
	}
	return nil
}

// noData reads the number that means missing.
func (f *file) noData(h *header, _ Options) error {
	s, err := f.text(h.img, tagNoData)
	if err != nil {
		return err
	}
	s = strings.TrimSpace(s)
	if s == "" {
		return nil
	}
	v, err := strconv.ParseFloat(strings.Replace(s, ",", ".", 1), 64)
	if err != nil && !math.IsInf(v, 0) {
		h.note("nodata_unreadable", geo.Warning, "value", short(s))
		return nil
	}
	if h.sample == floating && h.width == 4 {
		v = float64(float32(v)) // the text may have too few digits or too many
	}
	h.NoData, h.HasNoData = v, true
	return nil
}

// metadata reads what the tag of one widespread program adds: scale, offset, unit of the values.
func (f *file) metadata(h *header, _ Options) error {
	h.Scale = 1
	s, err := f.text(h.img, tagMetadata)
	if err != nil || s == "" {
		return err
	}
	d := xml.NewDecoder(strings.NewReader(strings.ToValidUTF8(s, "?")))
	d.Strict = false
	for {
		t, err := d.Token()
		if errors.Is(err, io.EOF) {
			break
		}
		if err != nil {
			h.note("metadata_unreadable", geo.Warning)
			return nil //nolint:nilerr // the notice says it
		}
		start, ok := t.(xml.StartElement)
		if !ok || start.Name.Local != "Item" {
			continue
		}
		var item struct {
			Sample string `xml:"sample,attr"`
			Role   string `xml:"role,attr"`
			Text   string `xml:",chardata"`
		}
		if err := d.DecodeElement(&item, &start); err != nil {
			h.note("metadata_unreadable", geo.Warning)
			return nil //nolint:nilerr // the notice says it
		}
		if item.Sample != "0" {
			continue
		}
		text := strings.TrimSpace(item.Text)
		switch item.Role {
		case "scale", "offset":
			v, err := strconv.ParseFloat(text, 64)
			if err != nil || math.IsNaN(v) || math.IsInf(v, 0) || item.Role == "scale" && v == 0 {
				return fault("bad_header", fmt.Sprintf("tag %d", tagMetadata), fmt.Sprintf("the %s of the values is %q", item.Role, short(text)), doGrid)
			}
			if item.Role == "scale" {
				h.Scale = v
			} else {
				h.Offset = v
			}
		case "unittype":
			if h.VerticalUnit == "" && text != "" {
				h.VerticalUnit, h.VerticalToM = unitByName(text)
			}
		}
	}
	return nil
}

// short makes a text of the file fit for a message: one line of at most 200 characters.
func short(s string) string {
	s = strings.Join(strings.FieldsFunc(strings.ToValidUTF8(s, "?"), func(r rune) bool { return unicode.IsSpace(r) || !unicode.IsPrint(r) }), " ")
	if r := []rune(s); len(r) > 200 {
		s = string(r[:200]) + "..."
	}
	return s
}
