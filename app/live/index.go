package live

import "groundtally/app/run"

// Index finds candidates by site, parcel and name.
type Index struct {
	Sites      []string              // in the order of the results
	Candidates [][]int               // by site: candidates in the results
	ByID       map[string]int        // candidate by run.Candidate.ID
	SiteOf     []int                 // by candidate: its site
	Fitted     int                   // candidates with a plant
	Spans      map[string][2]float64 // by consequence: see run.Results.Spans
	parcel     map[string]int
	site       map[string]int
}

// NewIndex makes the index of results.
func NewIndex(r *run.Results) *Index {
	x := &Index{ByID: make(map[string]int, len(r.Candidates)), SiteOf: make([]int, len(r.Candidates)), Spans: r.Spans(), parcel: map[string]int{}, site: map[string]int{}}
	for i := range r.Candidates {
		c := &r.Candidates[i]
		at, ok := x.site[c.Site]
		if !ok {
			at = len(x.Sites)
			x.site[c.Site] = at
			x.Sites, x.Candidates = append(x.Sites, c.Site), append(x.Candidates, nil)
			for _, p := range c.Parcels {
				x.parcel[p] = at
			}
		}
		x.Candidates[at] = append(x.Candidates[at], i)
		x.SiteOf[i] = at
		if c.Status == run.Fitted {
			x.Fitted++
		}
		x.ByID[c.ID()] = i
	}
	return x
}

// SiteOfParcel gives the site that a parcel belongs to; ok is false for a parcel that is not there.
func (x *Index) SiteOfParcel(id string) (site int, ok bool) {
	site, ok = x.parcel[id]
	return site, ok
}

// Site finds a site by its name.
func (x *Index) Site(name string) (site int, ok bool) {
	site, ok = x.site[name]
	return site, ok
}
