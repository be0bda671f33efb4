package gridfile

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"strings"

	"groundtally/geo"
	"groundtally/geo/formats"
	"groundtally/geo/formats/asciigrid"
	"groundtally/geo/formats/geotiff"
	"groundtally/geo/formats/hgt"
	"groundtally/geo/raster"
)

// Media types of the kinds of grid. They are written into studies, so they never change.
const (
	ASCIIGrid = "text/x-ascii-grid"
	GeoTIFF   = "image/tiff"
	HGT       = "application/x-hgt"
)

// MediaOf gives the media type that the ending of a file's name stands for, "" for none of them.
func MediaOf(name string) string {
	dot := strings.LastIndexByte(name, '.')
	switch strings.ToLower(name[dot+1:]) {
	case "asc":
		return ASCIIGrid
	case "tif", "tiff":
		return GeoTIFF
	case "hgt":
		return HGT
	}
	return ""
}

// Decode reads a grid of a media type. Name is that of the file, which places an HGT tile; messages
// name it. The reference system is "" where the file gives none. Heights in feet, where a GeoTIFF states
// feet, come in metres. Every fault is a *formats.Error; a stop through ctx comes as it is.
func Decode(ctx context.Context, media, name string, b []byte) (g *raster.Grid, crs string, notices []geo.Notice, err error) {
	switch media {
	case ASCIIGrid:
		res, err := asciigrid.Decode(ctx, bytes.NewReader(b), asciigrid.Options{File: name})
		if err != nil {
			return nil, "", nil, asError(err)
		}
		return res.Grid, "", res.Notices, nil
	case GeoTIFF:
		res, err := geotiff.Decode(ctx, bytes.NewReader(b), int64(len(b)), geotiff.Options{File: name, Metres: true})
		if err != nil {
			return nil, "", nil, err
		}
		return res.Grid, res.CRS, res.Notices, nil
	case HGT:
		res, err := hgt.Decode(ctx, bytes.NewReader(b), int64(len(b)), hgt.Options{File: name})
		if err != nil {
			return nil, "", nil, err
		}
		return res.Grid, res.CRS, res.Notices, nil
	}
	return nil, "", nil, &formats.Error{File: name, Code: "not_a_grid", What: fmt.Sprintf("%q is no kind of grid that is read", media), Do: "choose an ASCII grid, a GeoTIFF or an HGT tile"}
}

// asError gives the fault of an ASCII grid the form that the other kinds have.
func asError(err error) error {
	var a *asciigrid.Error
	if !errors.As(err, &a) {
		return err
	}
	return &formats.Error{File: a.File, Where: fmt.Sprintf("line %d, byte %d", a.Line, a.Offset), Code: a.Code, What: a.What, Do: a.Do, Err: a.Err}
}
