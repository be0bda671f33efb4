package study

import (
	"bytes"
	"context"
	"fmt"
	"math"
	"strings"

	"groundtally/geo"
	"groundtally/geo/formats/worldfile"
)

// BackdropRole is the role of a picture that is drawn under the map and counts for nothing.
const BackdropRole = "backdrop"

// Credit says who must be named beside a backdrop, and what may be done with it.
type Credit struct {
	Attribution string // needed
	Date        string // of the picture; may be empty
	Licence     string // may be empty, which is not the same as free
}

// Credit gives who must be named beside a backdrop. A picture has no columns, so that the record's match
// holds the texts of the role's fields themselves.
func (rec LayerRecord) Credit() Credit {
	return Credit{Attribution: rec.Match["attribution"], Date: rec.Match["date"], Licence: rec.Match["licence"]}
}

// Picture reports whether a file that was read can only be a backdrop: it is a picture and no grid of values.
func (in Import) Picture() bool {
	place, err := worldfile.OfMedia(in.Media)
	return err == nil && (place != nil || in.Media != "image/tiff")
}

// AddBackdrop puts a picture into the study, as it stands, as one journal entry. It answers with a
// *QuestionError when attribution or coordinate system are missing, and with a *FileError when the file is no
// picture that can be drawn.
func (s *Study) AddBackdrop(ctx context.Context, in Import, c Credit, tools Tools) (LayerRecord, error) {
	snap, err := s.Snapshot()
	if err != nil {
		return LayerRecord{}, err
	}
	rec := LayerRecord{Name: first(in.Replace, in.Name, strings.TrimSuffix(in.Base, ext(in.Base))), Role: BackdropRole, File: in.Base, Media: in.Media, Kind: "raster", Count: 1,
		Edition: first(in.Edition, c.Date), Holder: in.Holder, Ledger: in.Ledger, Notices: in.Notices, Match: map[string]string{}, Units: map[string]string{}}
	if in.Layer != nil {
		return rec, &FileError{File: in.File, What: "a backdrop is a picture, not features", Cure: "Give a PNG or JPEG with its world file, or a colour GeoTIFF"}
	}
	var ask []Question
	there := false
	for _, l := range snap.Layers {
		if l.Name != rec.Name {
			continue
		}
		there = true
		switch {
		case in.Replace == "":
			ask = append(ask, Question{fmt.Sprintf("a layer %q is there already", rec.Name), fmt.Sprintf("--replace %q, or --name with another name", rec.Name)})
		case l.Role != BackdropRole:
			ask = append(ask, Question{fmt.Sprintf("the layer %q has the role %s; a replacement keeps its role", rec.Name, l.Role), fmt.Sprintf("--as %s, or remove the layer first", l.Role)})
		default: // the same people are named, unless others are given
			old := l.Credit()
			c = Credit{first(c.Attribution, old.Attribution), c.Date, first(c.Licence, old.Licence)}
		}
	}
	switch {
	case in.Replace != "" && !there:
		ask = append(ask, Question{fmt.Sprintf("there is no layer %q to replace", in.Replace), fmt.Sprintf("--name %q", in.Replace)})
	case in.Replace != "" && in.Name != "" && in.Name != in.Replace:
		ask = append(ask, Question{"a replacement keeps the name of the layer it replaces", fmt.Sprintf("--replace %q without --name", in.Replace)})
	}
	for field, text := range map[string]string{"attribution": c.Attribution, "date": c.Date, "licence": c.Licence} {
		if text = strings.TrimSpace(text); text != "" {
			rec.Match[field] = text
		}
	}
	if rec.Match["attribution"] == "" {
		ask = append(ask, Question{"who must be named where the picture is shown?", `--attribution "© SURVEY OFFICE 2031" (for one)`})
	}
	if rec.CRS = first(in.CRSOption, in.CRS); rec.CRS == "" {
		ask = append(ask, Question{"neither the picture nor its world file says in which coordinate system it lies", "--crs EPSG:32626 (for one)"})
	}
	if len(ask) > 0 {
		return rec, &QuestionError{File: in.File, Questions: ask}
	}
	place, err := worldfile.OfMedia(in.Media)
	if err != nil {
		return rec, &FileError{File: in.File, What: err.Error(), Cure: "Give a PNG or JPEG with its world file, or a colour GeoTIFF"}
	}
	look, err := worldfile.Look(bytes.NewReader(in.Blob), int64(len(in.Blob)), worldfile.Options{})
	if err != nil {
		return rec, fmt.Errorf("%s: %w", in.File, err)
	}
	if place != nil {
		look.World, look.Placed = *place, true
	}
	if !look.Placed {
		return rec, &FileError{File: in.File, What: "the picture does not say where it lies", Cure: "Put its world file beside it"}
	}
	if err := rec.placed(in, look, tools); err != nil {
		return rec, err
	}
	meets(&rec, Import{Base: in.Base, SwapAxes: true}, snap) // it notes a picture that lies elsewhere
	version := Version{Digest: BlobDigest(in.Media, in.Blob), Blob: in.Blob, Media: in.Media}
	rec.Digest = version.Digest
	_, err = s.Edit(ctx, "add", first(in.Reason, in.Base+" as "+BackdropRole), []Change{{Kind: LayerRecKind, Key: rec.Name, New: Canonical(rec)}}, []Version{version})
	return rec, err
}

// placed finds where a picture lies, and by which way its coordinates come to degrees.
func (rec *LayerRecord) placed(in Import, look worldfile.Info, tools Tools) error {
	const cure = "Give the coordinate system with --crs AUTH:CODE"
	to, pipeline, err := tools.ToLonLat(rec.CRS)
	if err != nil {
		return &FileError{File: in.File, What: err.Error(), Cure: cure}
	}
	rec.Pipeline = pipeline
	w, h := float64(look.Width), float64(look.Height)
	x, y := look.World.At(w/2, h/2)
	op, err := tools.Operation(rec.CRS, geo.LonLat{Lon: x, Lat: y})
	if err != nil {
		return &FileError{File: in.File, What: "its middle is not in " + rec.CRS + ": " + err.Error(), Cure: cure}
	}
	rec.operated(op, in.Base)
	rec.Extent = [4]float64{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
	for _, at := range [][2]float64{{0, 0}, {w, 0}, {w, h}, {0, h}, {w / 2, h / 2}} {
		x, y := look.World.At(at[0], at[1])
		p, err := to(geo.LonLat{Lon: x, Lat: y})
		if err != nil || !p.Finite() {
			continue // a corner may lie beyond the system, as of a picture in a global one
		}
		e := &rec.Extent
		e[0], e[1], e[2], e[3] = math.Min(e[0], p.Lon), math.Min(e[1], p.Lat), math.Max(e[2], p.Lon), math.Max(e[3], p.Lat)
	}
	if !(rec.Extent[2] > rec.Extent[0]) {
		return &FileError{File: in.File, What: "the picture has no place in " + rec.CRS, Cure: cure}
	}
	return nil
}
