package main

import (
	"bytes"
	"context"
	_ "embed"
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"sync"
)

// overlayReference is a C program that does the same overlay. Its name keeps the go command from compiling it.
//
//go:embed overlayref.c.txt
var overlayReference []byte

const (
	overlayFolder  = ".build/overlay"
	overlayTrial   = "geo/overlay/overlaytest/trial"
	overlayParcels = 20000 // the whole set

	overlayShare = 0.75  // of the C program's rate per core that is asked of ours
	overlayWall  = 20.0  // seconds for the whole set, on two cores
	overlayRSS   = 700.0 // MB
	overlayOff   = 1e-6  // most that sums may differ, as a share of the gross area
)

// An overlayReport is what both programs print.
type overlayReport struct {
	Library       string  `json:"library"`
	Parcels       int     `json:"parcels"`
	Features      int     `json:"features"`
	Cores         int     `json:"cores"`
	WideningS     float64 `json:"wideningS"` // wall
	OverlayS      float64 `json:"overlayS"`  // wall
	WideningCPU   float64 `json:"wideningCPU"`
	OverlayCPU    float64 `json:"overlayCPU"`
	RSSMB         float64 `json:"rssMB"`
	GrossM2       float64 `json:"grossM2"`
	BuildableM2   float64 `json:"buildableM2"`
	TakenSharedM2 float64 `json:"takenSharedM2"`
	Retried       int     `json:"retried"`
	Digest        string  `json:"digest"`
	Rules         []struct {
		Name     string  `json:"name"`
		AloneM2  float64 `json:"aloneM2"`
		SharedM2 float64 `json:"sharedM2"`
		TakesAll int     `json:"takesAll"`
	} `json:"rules"`
}

func (r overlayReport) cpu() float64 { return r.WideningCPU + r.OverlayCPU }

// off gives the largest difference between the sums of two reports as a share of the gross area; infinite
// when they do not speak of the same parcels and rules.
func (r overlayReport) off(other overlayReport) float64 {
	if r.Parcels != other.Parcels || r.Features != other.Features || len(r.Rules) != len(other.Rules) || !(r.GrossM2 > 0) {
		return math.Inf(1)
	}
	most := 0.0
	see := func(a, b float64) {
		d := math.Abs(a-b) / r.GrossM2
		if math.IsNaN(d) {
			d = math.Inf(1)
		}
		most = max(most, d)
	}
	see(r.GrossM2, other.GrossM2)
	see(r.BuildableM2, other.BuildableM2)
	see(r.TakenSharedM2, other.TakenSharedM2)
	for i, a := range r.Rules {
		b := other.Rules[i]
		see(a.AloneM2, b.AloneM2)
		see(a.SharedM2, b.SharedM2)
		if a.TakesAll != b.TakesAll {
			return math.Inf(1)
		}
	}
	return most
}

// print writes what our program found and took.
func (r overlayReport) print(out io.Writer) {
	const km2 = 1e6
	fmt.Fprintf(out, "%d parcels among %d features, GEOS %s, %d workers\n", r.Parcels, r.Features, r.Library, r.Cores)
	fmt.Fprintf(out, "  widening %8.2f s wall %8.2f s processor\n", r.WideningS, r.WideningCPU)
	fmt.Fprintf(out, "  overlay  %8.2f s wall %8.2f s processor, %.0f parcels/s\n", r.OverlayS, r.OverlayCPU, float64(r.Parcels)/r.OverlayS)
	fmt.Fprintf(out, "  both     %8.2f s wall %8.2f s processor, peak memory %.0f MB\n", r.WideningS+r.OverlayS, r.cpu(), r.RSSMB)
	fmt.Fprintf(out, "  gross %.6f km2, buildable %.6f, taken by two or more %.6f; %d operations done again; digest %s\n", r.GrossM2/km2, r.BuildableM2/km2, r.TakenSharedM2/km2, r.Retried, r.Digest)
	for _, rule := range r.Rules {
		fmt.Fprintf(out, "  %-10s alone %12.6f km2, shared %12.6f km2, takes all of %d\n", rule.Name, rule.AloneM2/km2, rule.SharedM2/km2, rule.TakesAll)
	}
	if r.Parcels == overlayParcels {
		fmt.Fprintf(out, "  asked for the whole set on two cores: at most %.0f s wall and %.0f MB\n", overlayWall, overlayRSS)
	}
}

// compareOverlays prints ours beside the C program's and refuses sums that differ.
func compareOverlays(out io.Writer, ours, ref overlayReport) error {
	off := ours.off(ref)
	fmt.Fprintln(out, "beside a C program on the same library, one thread each, at the same time:")
	fmt.Fprintf(out, "  C    widening %.2f s, overlay %.2f s processor, peak memory %.0f MB\n", ref.WideningCPU, ref.OverlayCPU, ref.RSSMB)
	fmt.Fprintf(out, "  ours widening %.2f s, overlay %.2f s processor, peak memory %.0f MB\n", ours.WideningCPU, ours.OverlayCPU, ours.RSSMB)
	fmt.Fprintf(out, "  our rate per core: widening %.2f, overlay %.2f, both %.2f; asked is %.2f\n",
		ref.WideningCPU/ours.WideningCPU, ref.OverlayCPU/ours.OverlayCPU, ref.cpu()/ours.cpu(), overlayShare)
	fmt.Fprintf(out, "  sums differ by at most %.1e of the gross area\n", off)
	if !(off <= overlayOff) {
		return &failure{what: fmt.Sprintf("the two programs differ by %.1e of the gross area, more than %.0e", off, overlayOff), advice: "one of geo/overlay and cmd/dev/overlayref.c.txt is wrong"}
	}
	return nil
}

func runOverlay(ctx context.Context, w workshop, args []string) error {
	parcels, cores, reference, profile := overlayParcels, runtime.NumCPU(), true, ""
	err := parseAlone(w, "overlay", args, func(fs *flag.FlagSet) {
		fs.IntVar(&parcels, "parcels", parcels, "how many parcels of the set")
		fs.IntVar(&cores, "cores", cores, "how many workers")
		fs.BoolVar(&reference, "reference", reference, "compare with a C program on the same library")
		fs.StringVar(&profile, "profile", profile, "only write a processor profile to this `file` and print its top")
	})
	if err != nil {
		return err
	}
	return w.overlay(ctx, parcels, cores, reference, profile)
}

// overlay times the overlay of the hard set, beside the same in C.
func (w workshop) overlay(ctx context.Context, parcels, cores int, reference bool, profile string) error {
	folder := filepath.Join(w.root, filepath.FromSlash(overlayFolder))
	if err := os.MkdirAll(folder, 0o755); err != nil {
		return fmt.Errorf("make the folder for the trial: %w", err)
	}
	trial := program(folder, "trial")
	if err := w.build(ctx, []string{"./" + overlayTrial}, "-o", trial); err != nil {
		return err
	}
	run := func(cores int, more ...string) command {
		return command{dir: w.root, argv: append([]string{trial, "-parcels", fmt.Sprint(parcels), "-cores", fmt.Sprint(cores)}, more...)}
	}
	if profile != "" {
		if !filepath.IsAbs(profile) {
			profile = filepath.Join(w.root, profile)
		}
		if err := w.show(ctx, "overlay", run(cores, "-profile", profile), "read the message above"); err != nil {
			return err
		}
		return w.show(ctx, "overlay", command{dir: w.root, argv: []string{"go", "tool", "pprof", "-top", "-nodecount", "40", trial, profile}}, "is the go command complete?")
	}
	ours, err := w.overlayRun(ctx, run(cores))
	if err != nil {
		return err
	}
	ours.print(w.stdout)
	if !reference {
		return nil
	}

	source, compiled, set := filepath.Join(folder, "overlayref.c"), program(folder, "overlayref"), filepath.Join(folder, "set.bin")
	if err := os.WriteFile(source, overlayReference, 0o644); err != nil {
		return fmt.Errorf("write the C program: %w", err)
	}
	cc := w.m.getenv("CC")
	if cc == "" {
		cc = "cc"
	}
	c := command{dir: w.root, argv: []string{cc, "-O2", "-o", compiled, source, "-lgeos_c", "-lm"}}
	if err := w.show(ctx, "overlay", c, "look for the compiler and the headers of GEOS: go run ./cmd/dev doctor\nwithout the C program: go run ./cmd/dev overlay -reference=false"); err != nil {
		return err
	}
	defer func() { _ = os.Remove(set) }() // some 80 MB that can be made again
	if err := w.show(ctx, "overlay", run(1, "-set", set), "is the disk full?"); err != nil {
		return err
	}
	// Both on one core at the same time, so that whatever else the machine does slows both alike.
	var ref, one overlayReport
	var refErr, oneErr error
	var wg sync.WaitGroup
	wg.Go(func() { ref, refErr = w.overlayRun(ctx, command{dir: w.root, argv: []string{compiled, set}}) })
	wg.Go(func() { one, oneErr = w.overlayRun(ctx, run(1)) })
	wg.Wait()
	if err := errors.Join(refErr, oneErr); err != nil {
		return err
	}
	if one.Digest != ours.Digest {
		return &failure{what: fmt.Sprintf("one worker gives other results than %d: digests %s and %s", cores, one.Digest, ours.Digest), advice: "look for state that workers share in geo/overlay"}
	}
	return compareOverlays(w.stdout, one, ref)
}

// overlayRun runs one of the two programs and reads its report.
func (w workshop) overlayRun(ctx context.Context, c command) (r overlayReport, err error) {
	fmt.Fprintf(w.stderr, "overlay: %s\n", c)
	var out bytes.Buffer
	stop := watch(w.stderr, w.every, func() string { return "overlay: at work" })
	err = w.m.stream(ctx, c, &out, w.stderr)
	stop()
	if err != nil {
		return r, w.failed(ctx, "the trial failed", c, err, "read the message above")
	}
	if err := json.Unmarshal(out.Bytes(), &r); err != nil {
		return r, fmt.Errorf("read what %s printed: %w", c, err)
	}
	return r, nil
}
