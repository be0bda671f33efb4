package crs

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"net"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"sync/atomic"
	"testing"

	proj "github.com/twpayne/go-proj/v11"

	"groundtally/geo"
)

func transform(t testing.TB, code string) *Transform {
	t.Helper()
	tr, err := NewTransform(code)
	if err != nil {
		t.Fatal(err)
	}
	return tr
}

// The frame against the library at random places.
func TestFrameAgreesWithLibrary(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 7))
	ctx := proj.NewContext()
	for range 60 {
		f := mustFrame(t, math.Round(r.Float64()*3600-1800)/10, math.Round(r.Float64()*1660-830)/10)
		pj, err := ctx.New(fmt.Sprintf("+proj=laea +lat_0=%v +lon_0=%v +ellps=WGS84", f.Centre().Lat, f.Centre().Lon))
		if err != nil {
			t.Fatal(err)
		}
		for range 200 {
			a, d := r.Float64()*2*math.Pi, r.Float64()*MaxRadiusM*0.999
			ll, err := f.Inverse(geo.XY{X: d * math.Sin(a), Y: d * math.Cos(a)})
			if err != nil {
				t.Fatal(err)
			}
			got, err := f.Forward(ll)
			if err != nil {
				t.Fatal(err)
			}
			c := proj.NewCoord(ll.Lon, ll.Lat, 0, 0)
			want, err := pj.Forward(c.DegToRad())
			if err != nil {
				t.Fatal(err)
			}
			if dist := got.Dist(geo.XY{X: want.X(), Y: want.Y()}); dist > 1e-6 {
				t.Fatalf("centre %v, position %v: %.3g m from the library", f.Centre(), ll, dist)
			}
		}
	}
}

func TestCanonical(t *testing.T) {
	for in, want := range map[string]string{
		"EPSG:32626": "EPSG:32626", " epsg:32626 ": "EPSG:32626", "32626": "EPSG:32626", "EPSG::4326": "EPSG:4326",
		"urn:ogc:def:crs:EPSG::25832": "EPSG:25832", "urn:ogc:def:crs:OGC:1.3:CRS84": "OGC:CRS84", "ogc:crs84": "OGC:CRS84",
		"urn:ogc:def:crs:EPSG:6.9:2154": "EPSG:2154", "": "", "PROJCS[\"x\"]": "PROJCS[\"x\"]",
	} {
		if got := Canonical(in); got != want {
			t.Errorf("Canonical(%q) = %q, want %q", in, got, want)
		}
	}
}

func TestAxisOrder(t *testing.T) {
	// EPSG:4258 and EPSG:31467 state north before east; map files give east first.
	p, err := transform(t, "EPSG:4258").Forward(9, 48)
	if err != nil || math.Abs(p.Lon-9) > 1e-9 || math.Abs(p.Lat-48) > 1e-9 {
		t.Errorf("EPSG:4258 gave %v, %v", p, err)
	}
	tr := transform(t, "EPSG:4326")
	if !tr.Identity() {
		t.Error("WGS 84 is not recognised")
	}
	if p, err := tr.Forward(9, 48); err != nil || p != (geo.LonLat{Lon: 9, Lat: 48}) {
		t.Errorf("WGS 84 gave %v, %v", p, err)
	}
	x, y, err := transform(t, "32626").Inverse(geo.LonLat{Lon: -28, Lat: 38.5})
	if err != nil || math.Abs(x-412801.1200) > 1e-3 || math.Abs(y-4261767.1587) > 1e-3 {
		t.Errorf("inverse of EPSG:32626 gave %v, %v, %v", x, y, err)
	}
}

func TestTransformRefuses(t *testing.T) {
	for _, code := range []string{"", "EPSG:999999", "EPSG:4978", "EPSG:5773", "+proj=laea", "+proj=pipeline +step +proj=utm +zone=32", "nonsense", "a\x00b", "EPSG:1623", strings.Repeat("x", 1000)} {
		if _, err := NewTransform(code); !errors.Is(err, ErrUnknownCRS) {
			t.Errorf("%.30q gave %v, want ErrUnknownCRS", code, err)
		} else if len(err.Error()) > 300 {
			t.Errorf("the message for %.30q has %d bytes", code, len(err.Error()))
		}
	}
	tr := transform(t, "EPSG:25832")
	for _, c := range [][2]float64{{math.NaN(), 0}, {math.Inf(1), 5e6}, {1e30, 1e30}} {
		if p, err := tr.Forward(c[0], c[1]); err == nil {
			t.Errorf("%v gave %v", c, p)
		}
	}
	if _, err := transform(t, "EPSG:4326").Forward(412801, 4261767); err == nil {
		t.Error("metres were accepted as degrees")
	}
	if _, _, err := tr.Inverse(geo.LonLat{Lon: 9, Lat: 95}); err == nil {
		t.Error("latitude 95 was accepted")
	}
}

func TestNoDatabase(t *testing.T) {
	dir := t.TempDir()
	l, err := Open(dir)
	if !errors.Is(err, ErrNoDatabase) || !strings.Contains(err.Error(), dir) || !strings.Contains(err.Error(), "WGS 84") {
		t.Fatalf("got %v", err)
	}
	if _, err := l.NewTransform("EPSG:32626"); !errors.Is(err, ErrNoDatabase) {
		t.Errorf("got %v, want ErrNoDatabase", err)
	}
	tr, err := l.NewTransform("urn:ogc:def:crs:OGC:1.3:CRS84")
	if err != nil {
		t.Fatal(err)
	}
	if p, err := tr.Forward(9, 48); err != nil || p.Lat != 48 {
		t.Errorf("WGS 84 without a database gave %v, %v", p, err)
	}
	if l.Editions().Database != "" || l.Editions().Library == "" {
		t.Errorf("editions %+v", l.Editions())
	}
	// A broken database is no database.
	if err := os.WriteFile(filepath.Join(dir, "proj.db"), []byte("not a database"), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := Open(dir); !errors.Is(err, ErrNoDatabase) {
		t.Errorf("a broken database gave %v", err)
	}
}

func TestOwnDatabaseDirectory(t *testing.T) {
	l, err := Open("")
	if err != nil {
		t.Fatal(err)
	}
	data, err := os.ReadFile(l.DatabasePath())
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "proj.db"), data, 0o600); err != nil {
		t.Fatal(err)
	}
	own, err := Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	if own.DatabasePath() != filepath.Join(dir, "proj.db") {
		t.Errorf("the database read is %s", own.DatabasePath())
	}
	if e := own.Editions(); e != l.Editions() || !strings.HasPrefix(e.Database, "v") {
		t.Errorf("editions %+v, want %+v", e, l.Editions())
	}
	tr, err := own.NewTransform("EPSG:25832")
	if err != nil {
		t.Fatal(err)
	}
	if p, err := tr.Forward(500000, 5316300.2243); err != nil || math.Abs(p.Lat-48) > 2e-9 {
		t.Errorf("got %v, %v", p, err)
	}
	if again, err := own.NewTransform("25832"); err != nil || again != tr {
		t.Errorf("the transform is not kept: %v", err)
	}
}

func TestAccuracy(t *testing.T) {
	a, err := transform(t, "EPSG:25832").AccuracyAt(500000, 5316300)
	if err != nil {
		t.Fatal(err)
	}
	if !a.Known || a.Metres > 2 || a.Ballpark {
		t.Errorf("EPSG:25832: %+v", a)
	}
	// Far outside Great Britain only a ballpark shift is left.
	a, err = transform(t, "EPSG:27700").AccuracyAt(1219922.586, -152311.351)
	if err != nil {
		t.Fatal(err)
	}
	if !a.Ballpark {
		t.Errorf("EPSG:27700 at 9 E, 48 N: %+v, want a ballpark transform", a)
	}
}

// The library must not reach for the network even when the user's settings allow it. The control shows
// that the listener would notice.
func TestNetworkStaysOff(t *testing.T) {
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer ln.Close()
	var calls atomic.Int32
	go func() {
		for {
			c, err := ln.Accept()
			if err != nil {
				return
			}
			calls.Add(1)
			c.Close()
		}
	}()
	t.Setenv("PROJ_NETWORK_ENDPOINT", "http://"+ln.Addr().String())
	t.Setenv("PROJ_USER_WRITABLE_DIRECTORY", t.TempDir())
	t.Setenv("PROJ_NETWORK", "ON")

	use := func(ctx *proj.Context) {
		pj, err := ctx.NewCRSToCRS("EPSG:27700", "EPSG:4326", nil)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := pj.Forward(proj.NewCoord(400000, 300000, 0, math.Inf(1))); err != nil {
			t.Log(err)
		}
	}
	use(proj.NewContext())
	if calls.Load() == 0 {
		t.Fatal("the control made no network call, so this test proves nothing")
	}
	calls.Store(0)
	l, err := Open("")
	if err != nil {
		t.Fatal(err)
	}
	if os.Getenv("PROJ_NETWORK") != "OFF" {
		t.Error("the network setting was left on")
	}
	tr, err := l.NewTransform("EPSG:27700")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := tr.Forward(400000, 300000); err != nil {
		t.Fatal(err)
	}
	if n := calls.Load(); n != 0 {
		t.Errorf("%d network calls were made", n)
	}
}

func TestGeometryDensifies(t *testing.T) {
	tr := transform(t, "EPSG:25832")
	g := geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{{{X: 500000, Y: 5316300}, {X: 510000, Y: 5316300}}}}}
	ll, err := Geometry(tr, g)
	if err != nil {
		t.Fatal(err)
	}
	if n := ll.Count(); n < 6 || n > 7 {
		t.Errorf("10 km became %d positions", n)
	}
	// In degrees nothing is added.
	id, err := Geometry(transform(t, "EPSG:4326"), geo.LonLatGeometry{Kind: geo.Lines, Parts: [][][]geo.LonLat{{{{Lon: 9, Lat: 48}, {Lon: 10, Lat: 48}}}}})
	if err != nil || id.Count() != 2 {
		t.Errorf("got %v, %v", id, err)
	}
	if _, err := Geometry(tr, geo.XYGeometry{Kind: geo.Lines, Parts: [][][]geo.XY{{{{X: math.NaN()}}}}}); err == nil {
		t.Error("NaN was accepted")
	}
}

func TestConcurrentUse(t *testing.T) {
	tr := transform(t, "EPSG:25832")
	want, err := tr.Forward(512345.6, 5301234.5)
	if err != nil {
		t.Fatal(err)
	}
	var wg sync.WaitGroup
	for range 8 {
		wg.Go(func() {
			for i := range 500 {
				if got, err := tr.Forward(512345.6, 5301234.5); err != nil || got != want {
					t.Errorf("got %v, %v, want %v", got, err, want)
					return
				}
				if i%100 == 0 {
					if _, err := NewTransform(fmt.Sprintf("EPSG:%d", 32601+i/100)); err != nil {
						t.Error(err)
					}
				}
			}
		})
	}
	wg.Wait()
}

func BenchmarkTransform(b *testing.B) {
	tr := transform(b, "EPSG:25832")
	for b.Loop() {
		if _, err := tr.Forward(512345.6, 5301234.5); err != nil {
			b.Fatal(err)
		}
	}
}

// The shipped database is unpacked once, again when somebody changed it, into the next folder where the first takes
// none, and the library reads it.
func TestShippedDatabase(t *testing.T) {
	folder := t.TempDir()
	dir, err := unpackShipped(folder)
	if err != nil {
		t.Fatal(err)
	}
	path := filepath.Join(dir, databaseName)
	before, err := os.Stat(path)
	if err != nil {
		t.Fatal(err)
	}
	if again, err := unpackShipped(folder); err != nil || again != dir {
		t.Errorf("a second time gave %s, %v", again, err)
	}
	if after, err := os.Stat(path); err != nil || !os.SameFile(before, after) {
		t.Errorf("what was there was written again: %v", err)
	}
	if err := os.WriteFile(path, []byte("something else"), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := unpackShipped(folder); err != nil {
		t.Fatal(err)
	}
	if data, err := os.ReadFile(path); err != nil || !isShipped(data) {
		t.Errorf("a changed file stayed: %v", err)
	}
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if next, err := unpackShipped(file, folder); err != nil || next != dir {
		t.Errorf("beside a folder that takes nothing: %s, %v", next, err)
	}
	if _, err := unpackShipped(file); err == nil {
		t.Error("nowhere to write, and no error")
	}
	l, err := open(append([]string{dir}, ownPaths()...))
	if err != nil {
		t.Fatal(err)
	}
	if l.DatabasePath() != path || l.Editions().Database != "v10.076 (2022-08-31)" {
		t.Errorf("read is %s, %+v", l.DatabasePath(), l.Editions())
	}
	if shared, err := Shared(); err != nil || filepath.Base(filepath.Dir(shared.DatabasePath())) != filepath.Base(dir) {
		t.Errorf("the shared library reads %s: %v", shared.DatabasePath(), err)
	}
}
