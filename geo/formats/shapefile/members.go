package shapefile

import (
	"path"
	"slices"
	"strings"
)

// Names are the names of the files of one set, "" for one that is missing.
type Names struct {
	Base                    string // the name of the .shp without its ending
	SHP, DBF, SHX, PRJ, CPG string
}

// Members finds the sets among the names of the files of a folder or an archive, sorted by their bases.
// Endings and bases match without regard to case, a base that is written alike before one that is not. A
// set without a .shp is none.
func Members(names []string) []Names {
	type key struct{ base, ending string } // both in small letters
	found := map[key][]string{}
	var out []Names
	for _, n := range names {
		ending := path.Ext(n)
		base := strings.TrimSuffix(n, ending)
		// Some systems put a shadow file beside each file of an archive, by the same name after "._".
		if name := path.Base(strings.ReplaceAll(n, `\`, "/")); name == ending || strings.HasPrefix(name, "._") {
			continue
		}
		switch k := (key{strings.ToLower(base), strings.ToLower(ending)}); k.ending {
		case ".shp":
			out = append(out, Names{Base: base, SHP: n})
		case ".dbf", ".shx", ".prj", ".cpg":
			found[k] = append(found[k], n)
		}
	}
	for i := range out {
		s := &out[i]
		for _, m := range []struct {
			ending string
			to     *string
		}{{".dbf", &s.DBF}, {".shx", &s.SHX}, {".prj", &s.PRJ}, {".cpg", &s.CPG}} {
			like := found[key{strings.ToLower(s.Base), m.ending}]
			slices.Sort(like)
			for _, n := range like {
				if *m.to == "" || strings.HasPrefix(n, s.Base) && !strings.HasPrefix(*m.to, s.Base) {
					*m.to = n
				}
			}
		}
	}
	slices.SortFunc(out, func(a, b Names) int { return strings.Compare(a.SHP, b.SHP) })
	return out
}
