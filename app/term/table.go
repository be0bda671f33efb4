package term

import (
	"slices"
	"strings"

	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
)

var tableKeys = []string{"buildable_area_ha", "rated_kw", "delivered_mwh_per_yr", "eroi_delivered", "net_share", "footprint_direct_ha_per_gwh", "ghg_g_per_kwh", "nearest_dwelling_m", "habitat_ha", "connection_km"}

var verbTable = verb{
	name: "table", usage: "table STUDY.gpkg [--plant ID] [--site ID] [--sort KEY] [--top N] [--keys KEY,KEY] [--frozen NAME]", summary: "the consequence table",
	options: []option{{name: "plant", value: "ID", help: "only this plant option"}, {name: "site", value: "ID", help: "only this site"},
		{name: "sort", value: "KEY", help: "best first by this consequence"}, {name: "top", value: "N", help: "only the first N rows"},
		{name: "keys", value: "KEY,KEY", help: "columns to print; all are in the JSON"}, frozenOption, coresOption},
	places: [2]int{1, 1},
	run: func(c *call) (int, error) {
		top, err := c.args.whole("top", 1, 0)
		if err != nil {
			return 0, err
		}
		keys := tableKeys
		if v := c.args.get("keys"); v != "" {
			keys = strings.Split(v, ",")
		}
		wanted := keys
		if k := c.args.get("sort"); k != "" {
			wanted = append(slices.Clone(keys), k)
		}
		for _, k := range wanted {
			if !c.knownKey(k) {
				return 0, usagef("there is no consequence %q%s", k, run.LikeThis(k, c.keyNames()))
			}
		}
		return c.with(func(s *study.Study) (int, error) {
			r, err := c.compute(s)
			if err != nil {
				return 0, err
			}
			c.tell(r)
			if err := c.knownNames(r, c.args.get("site"), c.args.get("plant")); err != nil {
				return 0, err
			}
			var list []*run.Candidate
			for i := range r.Candidates {
				cand := &r.Candidates[i]
				if (c.args.has("plant") && cand.Plant != c.args.get("plant")) || (c.args.has("site") && cand.Site != c.args.get("site")) {
					continue
				}
				list = append(list, cand)
			}
			if k := c.args.get("sort"); k != "" {
				run.SortBy(list, c.Catalog, k)
			}
			all := len(list)
			if top > 0 && top < len(list) {
				list = list[:top]
			}
			if c.json {
				out := make([]map[string]any, len(list))
				for i, cand := range list {
					out[i] = cand.PublicJSON()
				}
				beside := make([]map[string]any, len(r.Alternatives))
				for i := range r.Alternatives {
					beside[i] = r.Alternatives[i].PublicJSON()
				}
				c.printJSON(map[string]any{"study": c.args.places[0], "candidates": out, "alternatives": beside, "of": all, "code": r.Code, "hours_per_year": 8760})
				return ExitDone, nil
			}
			rows := [][]string{}
			right := map[int]bool{}
			for i, head := range stacked(keys, 12) {
				row := []string{"", "", ""}
				if i == len(stacked(keys, 12))-1 {
					row = []string{"site", "plant", "status"}
				}
				rows = append(rows, append(row, head...))
			}
			unit := []string{"", "", ""}
			for i, k := range keys {
				unit = append(unit, unitWords(c.unitOf(k)))
				right[i+3] = true
			}
			rows = append(rows, unit)
			for _, cand := range list {
				row := []string{cand.Site, cand.Plant, strings.ReplaceAll(cand.Status, "_", " ")}
				for _, k := range keys {
					q, ok := cand.Consequence(k)
					if !ok {
						row = append(row, ".")
						continue
					}
					row = append(row, present.Cell(q))
				}
				rows = append(rows, row)
			}
			columns(c.out, rows, right)
			c.say("")
			columns(c.out, c.beside(r, keys), besideRight(keys))
			for i := range r.Alternatives {
				c.say("%s", pictures.About(&r.Alternatives[i]))
			}
			c.say("%d of %d candidates. %d of %d consequences are shown; the JSON holds all. A typical year has 8,760 hours.\nCentral values; low and high are in gtally why and in the JSON. \".\" stands where no plant was fitted.", len(list), all, len(keys), len(c.Params.Keys()))
			return ExitDone, nil
		})
	},
}

// beside gives what stands beside the candidates: doing nothing, saving the same, sealed ground.
func (c *call) beside(r *run.Results, keys []string) [][]string {
	var out [][]string
	heads := stacked(keys, 12)
	for i, head := range heads {
		first := ""
		if i == len(heads)-1 {
			first = "beside the candidates"
		}
		out = append(out, append([]string{first}, head...))
	}
	nothing := []string{"doing nothing"}
	for range keys {
		nothing = append(nothing, "none")
	}
	out = append(out, nothing)
	for i := range r.Alternatives {
		a := &r.Alternatives[i]
		row := []string{strings.ToLower(a.Title)}
		for _, k := range keys {
			row = append(row, present.Cell(a.Consequence(k)))
		}
		out = append(out, row)
	}
	return out
}

func besideRight(keys []string) map[int]bool {
	right := map[int]bool{}
	for i := range keys {
		right[i+1] = true
	}
	return right
}

// knownNames reports a site or a plant option that no candidate has; empty names are not asked about.
func (c *call) knownNames(r *run.Results, site, plant string) error {
	sites, plants := map[string]bool{}, map[string]bool{}
	for _, cand := range r.Candidates {
		sites[cand.Site], plants[cand.Plant] = true, true
	}
	if site != "" && !sites[site] {
		return usagef("there is no site %q among the %d%s", site, len(sites), run.LikeThis(site, sortedKeys(sites)))
	}
	if plant != "" && !plants[plant] {
		return usagef("there is no plant option %q; the options are: %s", plant, strings.Join(sortedKeys(plants), ", "))
	}
	return nil
}

func (c *call) keyNames() []string {
	var out []string
	for _, k := range c.Params.Keys() {
		out = append(out, k.Key)
	}
	return out
}

func (c *call) knownKey(key string) bool { return slices.Contains(c.keyNames(), key) }

func (c *call) unitOf(key string) string {
	for _, k := range c.Params.Keys() {
		if k.Key == key {
			return k.Unit
		}
	}
	return ""
}
