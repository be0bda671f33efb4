// Command makesample writes the files of the sample district, or a picture of it.
package main

import (
	"flag"
	"fmt"
	"image/png"
	"os"
	"path/filepath"
	"slices"

	"groundtally/sampledata/gen"
)

func main() {
	if err := run(); err != nil {
		fmt.Fprintln(os.Stderr, "makesample:", err)
		os.Exit(1)
	}
}

func run() error {
	seed := flag.Uint64("seed", gen.Seed, "seed of the district")
	dir := flag.String("dir", "marram", "folder that the files are written to")
	picture := flag.String("png", "", "write a picture of the island to this file and nothing else")
	x := flag.Float64("x", 0, "picture: metres east of the middle")
	y := flag.Float64("y", 0, "picture: metres north of the middle")
	scale := flag.Float64("scale", 16, "picture: metres per pixel")
	width := flag.Int("width", 1540, "picture: width in pixels")
	height := flag.Int("height", 980, "picture: height in pixels")
	flag.Parse()
	if *picture != "" {
		img, err := gen.Picture(*seed, *x, *y, *width, *height, *scale)
		if err != nil {
			return err
		}
		f, err := os.Create(*picture)
		if err != nil {
			return err
		}
		if err := png.Encode(f, img); err != nil {
			f.Close()
			return fmt.Errorf("write picture %s: %w", *picture, err)
		}
		return f.Close()
	}
	files, err := gen.Generate(*seed)
	if err != nil {
		return err
	}
	if err := os.MkdirAll(*dir, 0o755); err != nil {
		return err
	}
	var names []string
	for n := range files {
		names = append(names, n)
	}
	slices.Sort(names)
	total := 0
	for _, n := range names {
		if err := os.WriteFile(filepath.Join(*dir, n), files[n], 0o644); err != nil {
			return err
		}
		total += len(files[n])
		fmt.Printf("%-26s %8d\n", n, len(files[n]))
	}
	fmt.Printf("%-26s %8d\n", "together", total)
	return nil
}
