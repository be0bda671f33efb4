package mapview

import (
	"context"
	"image/color"
	"math"
	"testing"

	"groundtally/app/draw/tiles"
	"groundtally/geo"
	"groundtally/geo/raster"
)

// degrees places a file that is in degrees.
type degrees struct{}

func (degrees) Forward(x, y float64) (geo.LonLat, error)     { return geo.LonLat{Lon: x, Lat: y}, nil }
func (degrees) Inverse(p geo.LonLat) (x, y float64, _ error) { return p.Lon, p.Lat, nil }

// A relief that comes after the map shows, stays through a change of the look, and goes again.
func TestReliefShowsAndGoes(t *testing.T) {
	b := lay(t, squares(t, 10), 600, 500)
	b.settle()
	// A slope to the south-east, away from the light, of 10 % or so.
	h := &raster.Grid{NCols: 100, NRows: 100, XLL: -27.05, YLL: 47.45, CellX: 0.001, CellY: 0.001, NoData: -9999}
	for r := range h.NRows {
		for c := range h.NCols {
			h.Values = append(h.Values, float32(2000-5*c-8*r))
		}
	}
	relief, err := tiles.NewRelief(context.Background(), b.ground, h, degrees{})
	if err != nil || relief == nil {
		t.Fatalf("no relief: %v", err)
	}
	middle := func() color.NRGBA {
		b.settle()
		at := b.at("P55")
		return color.NRGBAModel.Convert(b.w.Canvas().Capture().At(int(at.X), int(at.Y))).(color.NRGBA)
	}
	plain := middle()
	if plain != teal {
		t.Fatalf("a parcel is %v, want %v", plain, teal)
	}
	b.m.SetRelief(relief)
	shaded := middle()
	if d := int(plain.G) - int(shaded.G); d < 2 || d > 25 {
		t.Errorf("a slope in the shade is %v, %v without it", shaded, plain)
	}
	b.m.SetLook(tiles.DarkLook())
	if dark := middle(); dark.G >= plain.G || math.Abs(float64(dark.R)-float64(plain.R)) > 25 {
		t.Errorf("in the dark look it is %v", dark)
	}
	b.m.SetLook(tiles.LightLook())
	b.m.SetRelief(nil)
	if again := middle(); again != plain {
		t.Errorf("without it again, it is %v, %v before", again, plain)
	}
}
