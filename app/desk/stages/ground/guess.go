package ground

import "groundtally/app/study"

// fits tells whether a role takes what a file is made of; an empty kind is not known yet.
func fits(r study.Role, made string) bool {
	if made == "picture" {
		return r.Name == study.BackdropRole
	}
	return made == "" || r.Accepts(made)
}

// madeOf tells of what a file is made: its first feature with a place, else rows, a grid or a picture.
func madeOf(in study.Import) string {
	if in.Layer == nil {
		if in.Picture() {
			return "picture"
		}
		return "raster"
	}
	for _, f := range in.Layer.Features {
		if !f.Geometry.Empty() {
			return f.Geometry.Kind.String()
		}
	}
	return "table"
}
