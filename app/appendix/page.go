package appendix

import (
	"bytes"
	"context"
	_ "embed"
	"fmt"
	"html/template"
	"slices"
	"sort"
	"strconv"
	"strings"

	"groundtally/app/draw"
	"groundtally/app/draw/svg"
	"groundtally/app/methods"
	"groundtally/app/present"
	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
)

//go:embed page.html
var pageHTML string

// Input is all that a page is made from. Nothing of it is the time of making: the same study gives the
// same bytes.
type Input struct {
	Snapshot *study.Snapshot
	Results  *run.Results
	Params   *run.Params
	Layers   []draw.MapLayer
	Notices  []geo.Notice
	Engines  []string
	Version  string
	Journal  []study.Entry
	Frozen   []study.Frozen
	Top      int // places of each voice shown in full; 0 takes 15
	// Course gives how the energy of a candidate comes over the year; nil leaves that out.
	Course func(*run.Candidate) (*run.Course, error)
	// Crowding sweeps the spacing or ground cover of a candidate, or of a part of it; nil leaves that out.
	Crowding func(c *run.Candidate, part string) (*run.Crowded, error)
}

// MapLayers reads the layers that a map shows. Personal columns are never read.
func MapLayers(ctx context.Context, snap *study.Snapshot, load run.Loader) ([]draw.MapLayer, error) {
	shown := map[string]bool{"district": true, "parcels": true, "water": true, "roads": true, "grid_lines": true, "substations": true, "dwellings": true, "place_names": true}
	var out []draw.MapLayer
	for _, rec := range snap.Layers {
		if !shown[rec.Role] || rec.Kind == "raster" || rec.Kind == "table" {
			continue
		}
		v, err := load(ctx, rec.Digest)
		if err != nil {
			return nil, fmt.Errorf("read layer %q: %w", rec.Name, err)
		}
		personal := map[string]bool{}
		for _, p := range rec.Personal {
			personal[p] = true
		}
		field := func(f geo.Feature, name string) geo.Value {
			col := rec.Match[name]
			if i := v.Layer.ColumnIndex(col); col != "" && i >= 0 && !personal[col] {
				return f.Values[i]
			}
			return geo.Value{}
		}
		l := draw.MapLayer{Role: rec.Role}
		for _, f := range v.Layer.Features {
			rank, _ := field(f, "rank").Float()
			l.Features = append(l.Features, draw.MapFeature{ID: f.ID, Name: field(f, "name").String(), Class: field(f, "class").String(), Rank: rank, Geometry: f.Geometry})
		}
		out = append(out, l)
	}
	return out, nil
}

// cautions are printed in every appendix.
var cautions = []string{
	"This is a screening. It sorts candidates; it replaces no permit, no survey, no measurement on site and no licensed engineer. Local codes prevail over every default shown here.",
	"Grid: only the network operator's study can offer a connection, its point, date, limit and charge. Lines and substations are live: never approach, measure, dig or fly near them on the strength of this page; call the operator and the buried-services enquiry first.",
	"Wind: setbacks for topple and ice throw are screening distances; ice throw, noise, shadow and structural safety need their own assessments by qualified people under local law.",
	"Unless hours measured at the place serve, yields rest on climatology: the odds stated are those of the model, and realised yields have on average come out lower than forecast.",
	"Figures marked default, unverified rest on values that were not checked against their source.",
}

// alwaysNotAssessed is what the program does not look at whatever the data.
var alwaysNotAssessed = []string{
	"noise, shadow flicker, visibility and glare, in this version of the program: where a voice weighs them they are unknown",
	"a routed grid connection: the length is the straight distance times a detour factor",
	"speed-up of the wind over hills, and blockage by a group of turbines as a whole, in the wind yield",
	"birds and bats, aviation and radar, telecommunication links, archaeology below ground",
	"storage and backup, labour, finance, insurance; money only where the user enters it",
	"foundations, geology, loads, access for cranes, strength of bridges and roofs",
	"ownership and contracts besides the noted consent; the opinion of anyone not asked",
}

// book is what the parts of a page share while it is written.
type book struct {
	in       Input
	info     map[string]run.KeyInfo
	plant    map[string]string         // title by id
	by       map[string]*run.Candidate // fitted and other candidates by id
	shown    map[string]bool           // candidates among the places shown
	accounts *run.Accounts             // behind the pictures; nil before the first
	told     bool                      // who told a spare capacity may be named
	notes    map[string]int            // number of each notice on consequences
	list     []string                  // their codes, by number
}

func newBook(in Input) *book {
	b := &book{in: in, info: map[string]run.KeyInfo{}, plant: map[string]string{}, by: map[string]*run.Candidate{}, shown: map[string]bool{}, told: true, notes: map[string]int{}}
	for _, k := range in.Params.Keys() {
		b.info[k.Key] = k
	}
	for _, p := range in.Snapshot.Plants() {
		b.plant[p] = first(in.Snapshot.Text("plant."+p+".title"), p)
	}
	for i := range in.Results.Candidates {
		c := &in.Results.Candidates[i]
		b.by[c.ID()] = c
	}
	for _, l := range in.Snapshot.Layers {
		for _, field := range []string{"told_by", "told_on"} {
			if col := l.Match[field]; col != "" && slices.Contains(l.Personal, col) {
				b.told = false
			}
		}
	}
	return b
}

// disputeView is a question on which the literature disagrees.
type disputeView struct{ Topic, Account, Disputed, Here, Now, Source string }

func (b *book) disputes() ([]disputeView, error) {
	list, err := methods.Shipped()
	if err != nil {
		return nil, fmt.Errorf("what the literature disputes: %w", err)
	}
	var out []disputeView
	for _, d := range list {
		now, err := methods.InForce(b.in.Params, b.in.Snapshot, d)
		if err != nil {
			return nil, fmt.Errorf("what the literature disputes, %s: %w", d.Topic, err)
		}
		out = append(out, disputeView{d.Topic, string(d.Account), d.Disputed, d.HereWords(b.in.Params), now, d.SourceWords()})
	}
	return out, nil
}

// title gives the words for a key; a key without any is shown as it is.
func (b *book) title(key string) string {
	return first(b.info[key].Title, strings.ReplaceAll(key, "_", " "))
}

func (b *book) titles(keys []string) string {
	out := make([]string, len(keys))
	for i, k := range keys {
		out[i] = b.title(k)
	}
	return strings.Join(out, ", ")
}

func (b *book) plantTitle(id string) string { return first(b.plant[id], id) }

func (b *book) rules(names []string) string {
	out := make([]string, len(names))
	for i, n := range names {
		out[i] = present.Rule(n)
	}
	return strings.Join(out, ", ")
}

// note gives the number of a notice code.
func (b *book) note(code string) int {
	if n, ok := b.notes[code]; ok {
		return n
	}
	b.list = append(b.list, code)
	b.notes[code] = len(b.list)
	return len(b.list)
}

func (b *book) noteNumbers(codes []string) string {
	out := make([]string, len(codes))
	for i, c := range codes {
		out[i] = strconv.Itoa(b.note(c))
	}
	return strings.Join(out, ", ")
}

// hexOnly gives the first digits of a check code, and nothing else, for the foot of printed pages.
func hexOnly(code string) string {
	code = code[:min(12, len(code))]
	return strings.Map(func(r rune) rune {
		if strings.ContainsRune("0123456789abcdef", r) {
			return r
		}
		return -1
	}, code)
}

// picture writes a scene of our own; its texts are escaped by the writer.
func picture(s *draw.Scene) template.HTML { return template.HTML(svg.Write(s)) }

func first(texts ...string) string {
	for _, t := range texts {
		if t != "" {
			return t
		}
	}
	return ""
}

type plantView struct {
	ID, Title, Technology, Fit string
	Fitted, NoRoom, Other      int
	Reasons                    []string
}

type settingView struct {
	Key, What, Value, Unit, From, Reason, Source string
	NotSet, Unverified                           bool
}

type factorView struct {
	ID, Low, Central, High, Unit, From, Source string
	Unverified                                 bool
}

// holder says who holds a layer; of a backdrop who must be named, and its licence.
func holder(l study.LayerRecord) string {
	if l.Role != study.BackdropRole {
		return l.Holder
	}
	c := l.Credit()
	words := []string{c.Attribution, "licence: " + c.Licence}
	if c.Licence == "" {
		words[1] = "licence not stated"
	}
	if l.Holder != "" {
		words = append([]string{l.Holder}, words...)
	}
	return strings.Join(words, "; ")
}

type layerView struct {
	Name, Role, CRS, Edition, Holder, Complete, Digest string
	Count, Read, Repaired, LeftOut                     int
}

type journalView struct {
	Seq, Changes           int64
	Day, Who, Verb, Reason string
}

// Page writes the appendix as one self-contained HTML page.
func Page(in Input) ([]byte, error) {
	if in.Top == 0 {
		in.Top = 15
	}
	b := newBook(in)
	data := map[string]any{
		"Name": first(in.Snapshot.Text("study.name"), "Study"), "Author": in.Snapshot.Text("study.author"), "Place": in.Snapshot.Text("study.place"),
		"Code": in.Results.Code, "Short": template.CSS(hexOnly(in.Results.Code.Check)), "Version": in.Version, "Engines": in.Engines, "Cautions": cautions, "NotAssessed": alwaysNotAssessed, "Terms": terms,
		"Seed": in.Snapshot.Text("run.seed"), "Trials": in.Snapshot.Text("run.trials"), "Mixes": in.Snapshot.Text("weigh.mixes"), "Spread": in.Snapshot.Text("weigh.spread"),
	}
	var voices []voiceView
	for i := range in.Results.Voices {
		v, err := b.voice(i)
		if err != nil {
			return nil, fmt.Errorf("voice %s: %w", in.Results.Voices[i].Voice, err)
		}
		voices = append(voices, v)
	}
	data["Voices"] = voices
	data["Maps"] = b.maps()
	data["Cloud"] = b.cloud()
	data["Plants"] = b.plants()
	data["Groups"] = b.groups()
	data["Shown"] = len(b.shown)
	bulk, fitted, noRoom := b.bulk()
	data["Bulk"], data["FittedCount"], data["NoRoomCount"] = bulk, fitted, noRoom
	data["KeyCount"], data["PageKeyCount"] = len(b.info), len(pageKeys)
	disputes, err := b.disputes()
	if err != nil {
		return nil, err
	}
	data["Disputes"] = disputes
	leads, others, err := b.unfoldings()
	if err != nil {
		return nil, err
	}
	data["Leads"], data["Others"] = leads, others
	data["Own"], data["Defaults"] = b.settings()
	var layers []layerView
	for _, l := range in.Snapshot.Layers {
		complete := "no"
		if l.Complete {
			complete = "yes"
		}
		layers = append(layers, layerView{Name: l.Name, Role: present.Named(l.Role), CRS: study.CRSWords(l.CRS), Edition: l.Edition, Holder: holder(l), Complete: complete, Digest: l.Digest[:min(16, len(l.Digest))], Count: l.Count, Read: l.Ledger.Read, Repaired: l.Ledger.Repaired, LeftOut: l.Ledger.LeftOut})
	}
	data["Layers"] = layers
	data["Exceptions"], data["Out"], data["Coverage"] = exceptions(in.Snapshot, in.Results), b.out(), coverage(in.Params, in.Results)
	if data["Factors"], err = b.factors(); err != nil {
		return nil, err
	}
	var glossary [][]string
	var missing []string
	for _, k := range in.Params.Keys() {
		if !k.Derived {
			glossary = append(glossary, []string{k.Title, k.Key, present.UnitWords(k.Unit), k.Sentence})
		}
		if _, ok := in.Params.Graph.Slot(k.Key); !ok && !k.Derived {
			missing = append(missing, k.Title)
		}
	}
	data["Glossary"], data["MissingKeys"] = glossary, missing
	var notices [][]string
	for _, n := range append(append([]geo.Notice(nil), in.Notices...), in.Results.Notices...) {
		notices = append(notices, []string{n.Severity.String(), present.Notice(n)})
	}
	data["Notices"] = notices
	var notes []string
	for _, code := range b.list {
		notes = append(notes, present.Sentence(code, nil))
	}
	data["Notes"] = notes
	var journal []journalView
	for _, e := range in.Journal {
		journal = append(journal, journalView{Seq: e.Seq, Changes: int64(len(e.Changes)), Day: e.At.UTC().Format("2006-01-02"), Who: e.Who, Verb: e.Verb, Reason: e.Reason})
	}
	data["Journal"] = journal
	var frozen []string
	for _, f := range in.Frozen {
		frozen = append(frozen, fmt.Sprintf("%s (after change %d, check code %s)", f.Name, f.Seq, first(f.Code, "not computed")))
	}
	data["Frozen"] = frozen

	t, err := template.New("page").Funcs(template.FuncMap{"inc": func(i int) int { return i + 1 }}).Parse(pageHTML)
	if err != nil {
		return nil, err
	}
	var out bytes.Buffer
	if err := t.Execute(&out, data); err != nil {
		return nil, fmt.Errorf("write the appendix: %w", err)
	}
	return out.Bytes(), nil
}

// plants sums up each plant option.
func (b *book) plants() []plantView {
	at := map[string]int{}
	var out []plantView
	for _, id := range b.in.Snapshot.Plants() {
		at[id] = len(out)
		out = append(out, plantView{ID: id, Title: b.plantTitle(id), Technology: present.Named(b.in.Snapshot.Text("plant." + id + ".technology")), Fit: present.Named(first(b.in.Snapshot.Text("plant."+id+".fit"), "fill"))})
	}
	for i := range b.in.Results.Candidates {
		c := &b.in.Results.Candidates[i]
		j, ok := at[c.Plant]
		if !ok {
			continue
		}
		switch c.Status {
		case run.Fitted:
			out[j].Fitted++
		case run.NoRoom:
			out[j].NoRoom++
		default:
			out[j].Other++
			if r := present.Reason(c.Reason); !slices.Contains(out[j].Reasons, r) {
				out[j].Reasons = append(out[j].Reasons, r)
			}
		}
	}
	for i := range out {
		sort.Strings(out[i].Reasons)
	}
	return out
}

// settings gives the settings of the study and the defaults in force.
func (b *book) settings() (own, defaults []settingView) {
	for _, k := range b.in.Snapshot.Keys() {
		s, byUser, ok := b.in.Snapshot.Lookup(k)
		if !ok {
			continue
		}
		v := settingView{Key: k, Value: first(s.Value, "not in force"), Unit: present.Unit(s.Unit), Reason: s.Reason, Source: s.Source, NotSet: s.Value == study.NotSetText}
		if d, there := b.in.Snapshot.Catalog().Definition(k); there {
			v.What = d.What
		}
		if byUser {
			v.From = first(s.AcceptedBy, "user")
			own = append(own, v)
			continue
		}
		v.From, v.Unverified = "default, "+present.Provenance(string(s.Provenance)), s.Provenance == "memory"
		if v.Unverified || s.Provenance == "" {
			v.From = strings.TrimPrefix(v.From, "default, ")
		}
		v.From = first(v.From, "default")
		if v.NotSet {
			v.From = "to be entered"
		}
		defaults = append(defaults, v)
	}
	return own, defaults
}

// factors lists every factor that the program ships, as it stands in this study.
func (b *book) factors() ([]factorView, error) {
	ids := make([]string, 0, len(b.in.Params.Factors))
	for id := range b.in.Params.Factors {
		ids = append(ids, id)
	}
	sort.Strings(ids)
	var out []factorView
	for _, id := range ids {
		f, changed, err := run.UserFactor(b.in.Params, b.in.Snapshot, id)
		if err != nil {
			return nil, err
		}
		v := factorView{ID: id, Low: plainNumber(f.Low), Central: plainNumber(f.Central), High: plainNumber(f.High), Unit: present.UnitWords(f.Unit), From: present.Provenance(string(f.Provenance)), Source: f.Source, Unverified: string(f.Provenance) == "memory"}
		if changed {
			v.From, v.Unverified = present.Provenance("user"), false
		}
		out = append(out, v)
	}
	return out, nil
}

// plainNumber writes a value to six digits, for a reader who reckons it again.
func plainNumber(x float64) string { return strconv.FormatFloat(x, 'g', 6, 64) }

// terms are the words of the page that are no consequences.
var terms = [][2]string{
	{"site", "one or more parcels considered together; by default each parcel is a site"},
	{"plant option", "a variant tried on every site: a technology with its size and rules"},
	{"candidate", "a site with one plant option fitted"},
	{"consequence", "one quantity that follows from a candidate: low, central, high, what that range means, unit and source"},
	{"account", "a family of consequences that is never merged silently with another: energy, land, climate, neighbours, grid"},
	{"voice", "the weights and value scales of one group"},
	{"score", "the weighted sum of values from 0 (worst) to 1 (best) on fixed scales; it is the middle of its interval"},
	{"tier", "candidates of an order that cannot be told apart, because their intervals overlap"},
	{"first in N of 100", "in how many of 100 weight mixes near the voice's weights, and of uncertain consequences, a candidate comes first"},
	{"tipping weight", "the weight at which first place changes hands"},
	{"dominated", "another candidate is at least as good in everything weighed and better in something"},
	{"limit, over the limit", "a threshold entered with its citation; a breach is marked and never netted off"},
	{"gate", "a condition that must hold before a candidate is ordered, such as the owner's consent"},
	{"unknown", "the data do not give it; hatched, and never taken as zero; in a score it counts half its weight and widens the interval"},
	{"not set", "a legal or policy value that must be entered and has not been"},
	{"none", "no such effect arises; it scores as best"},
	{"never", "a payback that never comes; it scores as worst"},
	{"not assessed", "the program does not look at it"},
	{"incomplete", "a legal rule is not set, so the candidate was computed without it"},
	{"default, unverified", "a value that was written down from memory and not checked against its source"},
	{"P10 to P90", "eight of ten trials with drawn inputs lie between these two values"},
	{"check code", "a digest over inputs, settings, editions and results; whoever has the study can compute it again"},
}
