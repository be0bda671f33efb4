package ground

import (
	"context"
	"slices"
	"strings"

	"groundtally/app/live"
	"groundtally/app/present"
	"groundtally/app/study"
	"groundtally/geo"
)

// noted sorts the notices of a view by what they belong to.
type noted struct {
	view  *live.View
	layer [][]geo.Notice // by layer of the snapshot
	whole []geo.Notice   // those that belong to no single layer
	warm  int            // those that want attention
}

// sortNotices sorts the notices of a view. What is missing has a pane of its own and is left out.
func sortNotices(v *live.View) *noted {
	out := &noted{view: v, layer: make([][]geo.Notice, len(v.Snap.Layers))}
	at := make(map[string]int, len(v.Snap.Layers))
	for i, l := range v.Snap.Layers {
		at[l.Name] = i
		out.layer[i] = slices.Clip(l.Notices)
	}
	for _, n := range v.Notices {
		switch i, there := at[n.Layer]; {
		case n.File != "" || n.Code == "role_missing": // the layers' own are there already
		case there:
			out.layer[i] = append(out.layer[i], n)
		default:
			out.whole = append(out.whole, n)
		}
	}
	if v.Results != nil && v.Current {
		out.whole = append(out.whole, v.Results.Notices...)
	}
	for _, list := range append(slices.Clip(out.layer), out.whole) {
		for _, n := range list {
			if n.Severity >= geo.Warning {
				out.warm++
			}
		}
	}
	return out
}

// inWindow puts what is said of the terminal program's options into words of the window.
var inWindow = strings.NewReplacer(
	"Name the column with --match parcel_id=COLUMN if there is one", "Replace the layer and choose the column of the identifiers, if there is one",
	"Say in which coordinate system they are, with --crs", "Say in which coordinate system they are",
	"Give the coordinate system with --crs AUTH:CODE", "Give its coordinate system, as EPSG:25832 for one",
	"Give the right coordinate system with --crs AUTH:CODE", "Give the right coordinate system, as EPSG:25832 for one",
	"Check --crs", "Check the coordinate system",
	"Add them with gtally add STUDY.gpkg FILE --as parcels", "Add a file of parcels",
	"Make one with gtally set STUDY.gpkg plant.wind.technology wind, for one", "Make one in the stage Plant",
)

// noticeWords writes where a notice belongs, and what it says.
func noticeWords(n geo.Notice, whole bool) (where, what string) {
	bare := n
	bare.Layer, bare.File = "", ""
	if whole {
		bare.Layer = n.Layer
	}
	what = inWindow.Replace(present.Sentence(n.Code, n.Args))
	where = strings.TrimSuffix(strings.TrimSuffix(present.Notice(bare), present.Sentence(n.Code, n.Args)), ": ")
	if what != "" {
		what = strings.ToUpper(what[:1]) + what[1:]
	}
	return where, what
}

// severityWord says how much a notice matters.
func severityWord(s geo.Severity) string {
	switch s {
	case geo.Fault:
		return "Fault"
	case geo.Warning:
		return "Look at"
	}
	return "Note"
}

// placeOf finds a feature in the contents of a layer.
func placeOf(ctx context.Context, store study.Store, l study.LayerRecord, feature string) (at geo.LonLat, ok bool, err error) {
	v, _, err := store.Version(ctx, l.Digest)
	if err != nil || v.Layer == nil {
		return at, false, err
	}
	for _, f := range v.Layer.Features {
		if f.ID != feature {
			continue
		}
		n := 0
		f.Geometry.Each(func(p geo.LonLat) {
			at.Lon, at.Lat = at.Lon+p.Lon, at.Lat+p.Lat
			n++
		})
		if n == 0 {
			return at, false, nil
		}
		return geo.LonLat{Lon: at.Lon / float64(n), Lat: at.Lat / float64(n)}, true, nil
	}
	return at, false, nil
}
