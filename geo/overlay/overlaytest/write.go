package overlaytest

import (
	"bufio"
	"encoding/binary"
	"io"
	"math"

	"groundtally/geo"
	"groundtally/geo/overlay"
)

// Write writes the set for a program in another language: numbers of rules, of segments to ask the library
// for, of features, of parcels; each feature with its rule, its radius in metres and its well-known binary
// with length; each parcel likewise. All is little-endian, numbers have 32 bits, radii 64. Segments and radii
// are those that package overlay asks for, so that both programs widen alike.
func Write(to io.Writer, s Set) error {
	w := bufio.NewWriterSize(to, 1<<20)
	var b []byte
	number := func(n int) { b = binary.LittleEndian.AppendUint32(b, uint32(n)) }
	number(len(s.Rules))
	number(overlay.SegmentsPerQuadrant * 3 / 2)
	number(s.Features())
	number(len(s.Parcels))
	flush := func() error {
		_, err := w.Write(b)
		b = b[:0]
		return err
	}
	longer := 1 / math.Cos(math.Pi/(4*overlay.SegmentsPerQuadrant))
	for i, r := range s.Rules {
		for _, src := range r.Sources {
			for _, f := range src.Features {
				number(i)
				b = binary.LittleEndian.AppendUint64(b, math.Float64bits(src.SetbackM*longer))
				b = appendWKB(b, f)
				if err := flush(); err != nil {
					return err
				}
			}
		}
	}
	for _, p := range s.Parcels {
		b = appendWKB(b, p)
		if err := flush(); err != nil {
			return err
		}
	}
	return w.Flush()
}

// appendWKB appends a line or a polygon of one part, which is all that a set holds, with its length.
func appendWKB(b []byte, g geo.XYGeometry) []byte {
	le := binary.LittleEndian
	from := len(b)
	b = append(b, 0, 0, 0, 0)
	if g.Kind == geo.Polygons {
		b = append(b, 1, 3, 0, 0, 0)
		b = le.AppendUint32(b, uint32(len(g.Parts[0])))
	} else {
		b = append(b, 1, 2, 0, 0, 0)
	}
	for _, ring := range g.Parts[0] {
		b = le.AppendUint32(b, uint32(len(ring)))
		for _, p := range ring {
			b = le.AppendUint64(b, math.Float64bits(p.X))
			b = le.AppendUint64(b, math.Float64bits(p.Y))
		}
	}
	le.PutUint32(b[from:], uint32(len(b)-from-4))
	return b
}
