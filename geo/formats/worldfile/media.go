package worldfile

import (
	"fmt"
	"strconv"
	"strings"
)

// types are the media types of the kinds of picture. They are written into studies, so they never change.
var types = map[string]string{"PNG": "image/png", "JPEG": "image/jpeg", "TIFF": "image/tiff"}

// worldParameter begins the parameter of a media type that holds the numbers of a world file.
const worldParameter = `; world="`

// Media gives the media type under which a picture is kept as it stands. The numbers of its world file become
// a parameter of it, in the order of such a file, so that a picture keeps its place without a file beside it.
func (in Info) Media() string {
	var words []string
	w := in.World
	for _, v := range []float64{w.A, w.D, w.B, w.E, w.C, w.F} {
		words = append(words, strconv.FormatFloat(v, 'f', -1, 64))
	}
	return types[in.Format] + worldParameter + strings.Join(words, " ") + `"`
}

// OfMedia gives the place that a media type of Media holds; nil where there is none, as of a TIFF that says its
// place itself. It is an error when the type is no kind of picture.
func OfMedia(media string) (*World, error) {
	kind, rest, placed := strings.Cut(media, worldParameter)
	known := false
	for _, t := range types {
		known = known || t == kind
	}
	if !known {
		return nil, fmt.Errorf("%q is no kind of picture that is drawn", media)
	}
	if !placed {
		return nil, nil
	}
	w, err := Decode(strings.NewReader(strings.TrimSuffix(rest, `"`)))
	if err != nil {
		return nil, err
	}
	return &w, nil
}
