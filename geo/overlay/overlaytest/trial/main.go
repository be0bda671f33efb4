// Command trial overlays the hard set of package overlaytest and tells what it found and what it took, as
// one line of JSON. go run ./cmd/dev overlay runs it beside a C program on the same library.
package main

import (
	"bufio"
	"context"
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"os"
	"os/signal"
	"runtime"
	"runtime/pprof"
	"time"

	"groundtally/geo/overlay"
	"groundtally/geo/overlay/overlaytest"
)

// report is what the program prints.
type report struct {
	Library     string  `json:"library"`
	Parcels     int     `json:"parcels"`
	Features    int     `json:"features"`
	Cores       int     `json:"cores"`
	WideningS   float64 `json:"wideningS"` // wall
	OverlayS    float64 `json:"overlayS"`  // wall
	WideningCPU float64 `json:"wideningCPU"`
	OverlayCPU  float64 `json:"overlayCPU"`
	RSSMB       float64 `json:"rssMB"`
	overlaytest.Found
}

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	err := run(ctx)
	stop()
	if err != nil {
		fmt.Fprintln(os.Stderr, "trial:", err)
		os.Exit(1)
	}
}

func run(ctx context.Context) (err error) {
	parcels := flag.Int("parcels", overlaytest.Parcels, "how many parcels")
	cores := flag.Int("cores", runtime.NumCPU(), "how many workers")
	seed := flag.Uint64("seed", 1, "seed of the set")
	set := flag.String("set", "", "only write the set to this `file`")
	profile := flag.String("profile", "", "write a processor profile to this `file`")
	flag.Parse()
	if *parcels < 1 || *cores < 1 || flag.NArg() > 0 {
		return errors.New("want at least one parcel and one core, and nothing else")
	}
	s := overlaytest.New(*seed, *parcels)
	if *set != "" {
		f, err := os.Create(*set)
		if err != nil {
			return err
		}
		return errors.Join(overlaytest.Write(f, s), f.Close())
	}
	if *profile != "" {
		f, err := os.Create(*profile)
		if err != nil {
			return err
		}
		w := bufio.NewWriter(f)
		if err := pprof.StartCPUProfile(w); err != nil {
			return errors.Join(err, f.Close())
		}
		defer func() {
			pprof.StopCPUProfile()
			err = errors.Join(err, w.Flush(), f.Close())
		}()
	}
	out := report{Library: overlay.LibraryVersion(), Parcels: len(s.Parcels), Features: s.Features(), Cores: *cores}
	begun, cpu := time.Now(), cpuSeconds()
	lap := func() (wall, own float64) {
		wall, own = time.Since(begun).Seconds(), cpuSeconds()-cpu
		begun, cpu = time.Now(), cpuSeconds()
		return wall, own
	}
	layers, err := overlaytest.Widen(ctx, s, *cores)
	if err != nil {
		return err
	}
	out.WideningS, out.WideningCPU = lap()
	if out.Found, err = overlaytest.Overlay(ctx, s, layers, *cores); err != nil {
		return err
	}
	out.OverlayS, out.OverlayCPU = lap()
	out.RSSMB = float64(peakRSS()) / (1 << 20)
	return json.NewEncoder(os.Stdout).Encode(out)
}
