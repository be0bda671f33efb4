package sampledata

import (
	"embed"
	"fmt"
	"io/fs"

	"groundtally/sampledata/manifest"
)

//go:generate go run ./makesample -dir marram

//go:embed marram
var files embed.FS

// FS gives the files of the district, without a folder before their names.
func FS() fs.FS {
	sub, err := fs.Sub(files, "marram")
	if err != nil {
		panic(err) // the folder is part of the program
	}
	return sub
}

// Manifest says what each file of the district is and which flaws were put into them.
func Manifest() (manifest.Manifest, error) {
	b, err := files.ReadFile("marram/manifest.json")
	if err != nil {
		return manifest.Manifest{}, fmt.Errorf("read the sample's manifest: %w", err)
	}
	return manifest.Parse(b)
}
