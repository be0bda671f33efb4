package gen

import (
	"os"
	"testing"

	"groundtally/assets/citedtable"
	"groundtally/geo"
)

func TestProjectionChecks(t *testing.T) {
	table, err := citedtable.ParseFS(os.DirFS("../../testdata/check"), "sample_projection.csv")
	if err != nil {
		t.Fatal(err)
	}
	checks, err := table.Checks()
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range checks {
		t.Run(c.ID, func(t *testing.T) {
			var got float64
			switch c.Quantity {
			case "utm_easting_m":
				got, _ = utmForward(geo.LonLat{Lon: c.In["lon"], Lat: c.In["lat"]}, c.In["meridian"])
			case "utm_northing_m":
				_, got = utmForward(geo.LonLat{Lon: c.In["lon"], Lat: c.In["lat"]}, c.In["meridian"])
			case "utm_inverse_lon_deg":
				got = utmInverse(c.In["x"], c.In["y"], c.In["meridian"]).Lon
			case "utm_inverse_lat_deg":
				got = utmInverse(c.In["x"], c.In["y"], c.In["meridian"]).Lat
			default:
				t.Fatalf("unknown quantity %q", c.Quantity)
			}
			if !c.OK(got) {
				t.Errorf("%s = %.9f, want %.9f within %g", c.Quantity, got, c.Expected, c.Tolerance)
			}
		})
	}
}

func TestPlaneThereAndBack(t *testing.T) {
	for _, p := range kms(-12, -7.5, 12, 7.5, 0, 0, 3.3, -6.9) {
		e, n := utmForward(lonLat(p), centralMeridianDeg)
		if back := (geo.XY{X: e - originEastingM, Y: n - originNorthingM}); back.Dist(p) > 1e-5 {
			t.Errorf("%v comes back as %v", p, back)
		}
	}
}
