package appendix

import (
	"fmt"
	"html/template"
	"strconv"
	"strings"
	"time"

	"groundtally/app/draw"
	"groundtally/app/draw/chart"
	"groundtally/app/pictures"
	"groundtally/app/present"
	"groundtally/app/run"
)

// Widths of the pictures, in their own units: across the page, or half of it beside a table.
const (
	fullWidth = 1000
	halfWidth = 560
)

// bars draws the scores of a voice by their parts.
func (b *book) bars(rows []run.Row, keys []string, title string, index int) *draw.Scene {
	in := chart.Scores{ID: "-" + strconv.Itoa(index+1),
		Title: fmt.Sprintf("Bar chart: scores under the voice %s, by part, for %d places; the same figures stand in the table below it", title, len(rows))}
	colours := run.Categories(b.in.Snapshot, b.in.Params)
	for _, k := range keys {
		in.Keys = append(in.Keys, chart.ScoreKey{Category: colours[k], Title: b.title(k), Weight: rows[0].Parts.Of(k).Weight})
	}
	for _, r := range rows {
		row := chart.ScoreRow{Name: fmt.Sprintf("%d. %s", r.Place, b.candidateName(r.ID())), Score: r.Score, Low: r.ScoreLow, High: r.ScoreHigh}
		if len(r.OverLimit) > 0 {
			row.Over = "over the limit: " + b.titles(r.OverLimit)
		}
		for _, k := range keys {
			p := r.Parts.Of(k)
			row.Parts = append(row.Parts, chart.ScorePart{Share: p.Share, Unknown: !p.Known})
		}
		in.Rows = append(in.Rows, row)
	}
	return chart.ScoreBars(in, draw.Light(), fullWidth)
}

// pair draws the first two places of a voice against each other; nothing where there is only one.
func (b *book) pair(v run.VoiceOrder, keys []string, title string, index int) template.HTML {
	if len(v.Order) < 2 {
		return ""
	}
	var rows [2]run.Row
	var cands [2]*run.Candidate
	var names [2]string
	for i := range rows {
		rows[i] = v.Order[i]
		cands[i] = b.by[rows[i].ID()]
		names[i] = b.candidateName(rows[i].ID())
	}
	infos := make([]run.KeyInfo, len(keys))
	for i, k := range keys {
		infos[i] = b.info[k]
	}
	in := pictures.Pair(rows, cands, names, infos, "Bar chart: the first two places under the voice "+title+" against each other, by consequence", "-pair-"+strconv.Itoa(index+1))
	return picture(chart.PairBars(in, draw.Light(), fullWidth))
}

// cloud draws all fitted candidates by power for each area and energy return, which pull against each
// other, with the first of each voice marked by its number.
func (b *book) cloud() template.HTML {
	keys := [2]run.KeyInfo{b.info["power_density_w_per_m2"], b.info["eroi_delivered"]}
	if keys[0].Key == "" || keys[1].Key == "" || len(b.in.Results.Voices) == 0 {
		return ""
	}
	marks := map[string]string{}
	for i, v := range b.in.Results.Voices {
		for _, r := range v.Order {
			if r.Site != run.NoSite {
				if marks[r.ID()] != "" {
					marks[r.ID()] += ", "
				}
				marks[r.ID()] += strconv.Itoa(i + 1)
				break
			}
		}
	}
	in := pictures.Cloud(b.in.Results, keys, [2]chart.Better{chart.More, chart.More}, "", b.plant, marks)
	if len(in.Points) == 0 {
		return ""
	}
	in.Title = "Scatter chart: all fitted candidates by " + keys[0].Title + " and " + keys[1].Title + "; the figures stand in the tables below it"
	return picture(chart.Scatter(in, draw.Light(), fullWidth))
}

// losses draws the loss chain of a candidate; nothing where it has none.
func losses(c *run.Candidate, title string) template.HTML {
	in, ok := pictures.Losses(c, "Bar chart: yield of "+title+" step by step; the same steps stand in the table above it", "")
	if !ok {
		return ""
	}
	return picture(chart.Waterfall(in, draw.Light(), halfWidth))
}

// land draws how the area of a candidate's site comes down to its buildable area. The hatching of rules
// that are not set needs a name of its own on the page.
func land(c *run.Candidate, title, id string) template.HTML {
	return picture(chart.TakenBars(pictures.Land(c, "Bar chart: area of the site of "+title+", taken by each rule or buildable; the same figures stand in the table above it", id), draw.Light(), halfWidth))
}

// crowding draws what a hectare gives against what comes back, as spacing or ground cover changes; nothing where nobody
// tells it.
func (b *book) crowding(c *run.Candidate, title, id string) ([]crowdingView, error) {
	if b.in.Crowding == nil {
		return nil, nil
	}
	var out []crowdingView
	for _, part := range run.CrowdingParts(c) {
		curve, err := b.in.Crowding(c, part)
		if err != nil {
			return nil, err
		}
		v := crowdingView{Words: pictures.CrowdingWords(curve)}
		if curve.Why == "" {
			v.Picture = picture(chart.Crowding(pictures.Crowding(curve, "Line chart: energy from a hectare against energy return of "+title, id+part), draw.Light(), halfWidth))
		}
		out = append(out, v)
	}
	return out, nil
}

// crowdingView is a crowding curve; without a picture the words say why there is none.
type crowdingView struct {
	Words   string
	Picture template.HTML
}

// monthsView is the energy of a candidate by month.
type monthsView struct {
	Picture template.HTML
	Rows    []monthView
	Why     string // what keeps months unknown
	Hours   template.HTML
	// Turbines are the curve over the wind and the wakes of a plant with turbines.
	Turbines template.HTML
	Models   string
	Sky      string
	Spread   string
}

type monthView struct{ Month, MWh string }

// months draws the energy of a candidate by month; nil where nobody tells it.
func (b *book) months(c *run.Candidate, title, id string) (*monthsView, error) {
	if b.in.Course == nil {
		return nil, nil
	}
	course, err := b.in.Course(c)
	if err != nil {
		return nil, err
	}
	in, why := pictures.Months(course.Months, "Column chart: energy of "+title+" by month; the same figures stand in the table beside it", id)
	out := &monthsView{Picture: picture(chart.Monthly(in, draw.Light(), halfWidth)), Why: why}
	if course.Hours != nil {
		out.Hours = picture(chart.DayByMonth(pictures.Hours(course, "Map: energy of "+title+" by month and hour of the day", id+"-hours"), draw.Light(), halfWidth))
	}
	if course.Rose != nil {
		out.Hours = picture(chart.WindRose(pictures.Rose(course.Rose, "Rose: wind and energy of "+title+" by direction", id+"-rose"), draw.Light(), halfWidth))
	}
	if v := course.Turbines; v != nil {
		out.Turbines = picture(chart.CurveOverWind(pictures.Curve(v.Curve, "Column chart: power of a turbine of "+title+" over the wind", id+"-curve"), draw.Light(), halfWidth)) +
			picture(chart.WakeMap(pictures.Wakes(v.Wakes, "Map: wakes of "+title, id+"-wakes"), draw.Light(), halfWidth))
		out.Models = pictures.WakeModels(v.Models)
	}
	out.Sky, out.Spread = pictures.SkySpread(course.Sky), strings.TrimSpace(pictures.Spread(course.Doubt)+pictures.WindSpread(course.Wind)+" "+pictures.Together(c.Connection))
	for m, v := range course.Months {
		row := monthView{Month: time.Month(m + 1).String(), MWh: v.State.String()}
		if v.OK() {
			row.MWh = present.Figure(v.X, v.X, v.X)
		}
		out.Rows = append(out.Rows, row)
	}
	return out, nil
}

// accountPicture is one of the accounts of a candidate, with its caption as text for readers who cannot see it.
type accountPicture struct {
	Caption string
	Label   string
	Picture template.HTML
}

// openAccounts prepares the accounts when they are first asked for.
func (b *book) openAccounts() (*run.Accounts, error) {
	if b.accounts == nil {
		a, err := run.NewAccounts(b.in.Params, b.in.Snapshot)
		if err != nil {
			return nil, fmt.Errorf("prepare the accounts: %w", err)
		}
		b.accounts = a
	}
	return b.accounts, nil
}

// said tells a candidate's saving, its power on the ground, and the habitat that it touches.
func (b *book) said(c *run.Candidate) (words, habitat []string, err error) {
	if c.Status != run.Fitted {
		return nil, nil, nil
	}
	a, err := b.openAccounts()
	if err != nil {
		return nil, nil, err
	}
	s, why, err := a.Saving(c)
	if err != nil {
		return nil, nil, fmt.Errorf("saving that equals %s: %w", c.ID(), err)
	}
	return []string{pictures.Saving(s, why), pictures.Densities(a.Values(c))}, pictures.Habitat(c.Habitat, a.Values(c)("life_yr").X), nil
}

// accountPictures draws the energy return by boundary, the ground taken, the carbon payback and what moves the energy
// return; without numbers the caption says why. id tells them from those of other candidates on the page.
func (b *book) accountPictures(c *run.Candidate, title, id string) ([]accountPicture, error) {
	if c.Status != run.Fitted {
		return nil, nil
	}
	if _, err := b.openAccounts(); err != nil {
		return nil, err
	}
	value := b.accounts.Values(c)
	lines, why, err := b.accounts.PaybackLines(c)
	if err != nil {
		return nil, fmt.Errorf("payback of %s: %w", c.ID(), err)
	}
	const moved = "eroi_extended"
	drivers, trials, err := b.accounts.Drivers(c, moved)
	if err != nil {
		return nil, fmt.Errorf("what moves %s: %w", c.ID(), err)
	}
	light := draw.Light()
	rungs := pictures.Boundaries(c, value, "Bar chart: energy return by boundary of "+title, id+"-ladder")
	taken := pictures.GroundTaken(c, value, "Bar chart: ground taken by "+title, id+"-ground")
	paid := pictures.Paybacks(c, lines, why, value, "Line chart: carbon payback of "+title, id+"-payback")
	moving := pictures.DriversOf(drivers, trials, b.title(moved), "Bar chart: what moves the energy return of "+title, id+"-moving")
	out := []accountPicture{{Caption: pictures.BoundariesWords(rungs), Label: "Energy return by boundary", Picture: picture(chart.Ladder(rungs, light, halfWidth))}}
	if b.in.Snapshot.Text("energy.primary_equivalent") == pictures.PrimaryEquivalent {
		as := pictures.PrimaryBoundaries(c, value, "Bar chart: energy return as primary equivalent of "+title, id+"-primary")
		out = append(out, accountPicture{Caption: pictures.BoundariesWords(as), Label: "Energy return as primary equivalent", Picture: picture(chart.Ladder(as, light, halfWidth))})
	}
	ledger, why, err := b.accounts.Ledger(c)
	if err != nil {
		return nil, fmt.Errorf("account on a common horizon of %s: %w", c.ID(), err)
	}
	sum := pictures.HorizonSum(ledger, why, value, "Line chart: account on a common horizon of "+title, id+"-horizon")
	out = append(out,
		accountPicture{Caption: pictures.Ledger(ledger, why), Label: "Account on a common horizon", Picture: picture(chart.YearLine(sum, light, halfWidth))},
		accountPicture{Caption: pictures.GroundWords(taken), Label: "Ground taken", Picture: picture(chart.LandBars(taken, light, halfWidth))},
		accountPicture{Caption: pictures.PaybackWords(paid), Label: "Carbon payback", Picture: picture(chart.PaybackLine(paid, light, halfWidth))})
	last := accountPicture{Label: "What moves " + b.title(moved)}
	if q, _ := c.Consequence(moved); trials == 0 {
		last.Caption = first(present.WhyNot(q), "unknown: no trials")
	} else {
		last.Caption, last.Picture = pictures.DriversWords(moving), picture(chart.Tornado(moving, light, halfWidth))
	}
	return append(out, last), nil
}
