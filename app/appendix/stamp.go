package appendix

import (
	"bytes"
	"compress/gzip"
	"encoding/base64"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strconv"

	"groundtally/app/run"
	"groundtally/app/study"
	"groundtally/geo"
	"groundtally/scoring"
)

// StampFile is the file beside the page that verify reads.
const StampFile = "check-code.json"

// Stamp says what an appendix was made from and what it found. Values holds the results, compressed, so
// that a later run can be compared value by value.
type Stamp struct {
	Program  string         `json:"program"`
	Code     run.Code       `json:"code"`
	Editions map[string]int `json:"formula_editions"`
	Values   string         `json:"values"`
}

// values are the results as far as Compare looks at them, written column by column. Numbers have nine
// digits: results that differ in further ones agree.
type values struct {
	Keys       []string        `json:"keys"` // of the consequences, in the order of the vocabulary
	Candidates []stampedOne    `json:"candidates"`
	Voices     []stampedVoices `json:"voices"`
}

type stampedOne struct {
	Site         string       `json:"s"`
	Plant        string       `json:"p"`
	Status       string       `json:"st"`
	Turbines     *int         `json:"t,omitempty"` // nil without a fit
	Consequences []figure     `json:"c"`
	Habitat      *run.Habitat `json:"h,omitempty"`
}

// figure is one consequence: which key, its state, and its numbers or the reason in their place.
type figure struct {
	Key     int           `json:"k"`
	State   scoring.State `json:"s,omitempty"`
	Why     string        `json:"w,omitempty"`
	Low     json.Number   `json:"l,omitempty"`
	Central json.Number   `json:"c,omitempty"`
	High    json.Number   `json:"h,omitempty"`
}

type stampedVoices struct {
	Voice  string          `json:"voice"`
	Order  []stampedRow    `json:"order"`
	Held   []run.Held      `json:"held,omitempty"`
	Beside []stampedBeside `json:"beside,omitempty"`
}

type stampedBeside struct {
	ID    string      `json:"i"`
	Why   string      `json:"w,omitempty"`
	Place int         `json:"p,omitempty"`
	Score json.Number `json:"x"`
}

type stampedRow struct {
	Site  string      `json:"s"`
	Plant string      `json:"p,omitempty"`
	Tier  int         `json:"t"`
	Score json.Number `json:"x"`
}

// NewStamp makes the stamp of results. The same results give the same bytes. Names of people who told a
// capacity and columns of layers are not in it.
func NewStamp(r *run.Results, version string) Stamp {
	var b bytes.Buffer
	w, _ := gzip.NewWriterLevel(&b, gzip.BestCompression) // the level is a constant that exists
	// Writing to memory cannot fail, and every part of the values has a JSON form.
	_ = json.NewEncoder(w).Encode(stampedValues(r))
	_ = w.Close()
	return Stamp{Program: version, Code: r.Code, Editions: run.Editions(), Values: base64.StdEncoding.EncodeToString(b.Bytes())}
}

func nine(x float64) json.Number { return json.Number(strconv.FormatFloat(x, 'g', 9, 64)) }

func stampedValues(r *run.Results) values {
	var v values
	at := map[string]int{}
	for i := range r.Candidates {
		c := &r.Candidates[i]
		one := stampedOne{Site: c.Site, Plant: c.Plant, Status: c.Status, Habitat: c.Habitat}
		if c.Fit != nil {
			n := len(c.Fit.Turbines)
			one.Turbines = &n
		}
		for _, q := range c.All() {
			k, ok := at[q.Key]
			if !ok {
				k = len(v.Keys)
				at[q.Key], v.Keys = k, append(v.Keys, q.Key)
			}
			f := figure{Key: k, State: q.State, Why: q.Why}
			if q.State == scoring.Number {
				f.Central = nine(q.Central)
				if q.Low != q.Central {
					f.Low = nine(q.Low)
				}
				if q.High != q.Central {
					f.High = nine(q.High)
				}
			}
			one.Consequences = append(one.Consequences, f)
		}
		v.Candidates = append(v.Candidates, one)
	}
	for _, o := range r.Voices {
		s := stampedVoices{Voice: o.Voice, Held: o.HeldBack}
		for _, b := range o.Beside {
			s.Beside = append(s.Beside, stampedBeside{ID: b.ID, Why: b.Why, Place: b.Place, Score: nine(b.Score)})
		}
		for _, row := range o.Order {
			s.Order = append(s.Order, stampedRow{Site: row.Site, Plant: row.Plant, Tier: row.Tier, Score: nine(row.Score)})
		}
		v.Voices = append(v.Voices, s)
	}
	return v
}

// ReadStamp reads the stamp of an appendix folder.
func ReadStamp(folder string) (*Stamp, error) {
	path := filepath.Join(folder, StampFile)
	b, err := os.ReadFile(path)
	if errors.Is(err, os.ErrNotExist) {
		return nil, &study.FileError{File: path, What: "there is no check code here", Cure: "Give the folder that gtally appendix wrote"}
	}
	if err != nil {
		return nil, err
	}
	var s Stamp
	if err := json.Unmarshal(b, &s); err != nil {
		return nil, &study.FileError{File: path, What: "the check code cannot be read: " + err.Error(), Cure: "The file may have been changed; write the appendix again"}
	}
	return &s, nil
}

// Compare compares fresh results with those of the appendix: "identical", "agrees", or the first
// difference. Steps whose formula edition has changed are named instead of compared.
func (s *Stamp) Compare(fresh *run.Results, version string) (string, *run.Difference) {
	if s.Code.Check == fresh.Code.Check {
		return "identical", nil
	}
	now := run.Editions()
	for _, step := range []string{"ground", "lie", "fit", "candidate", "order"} {
		if s.Editions[step] != now[step] {
			return "", &run.Difference{Where: "formula edition of the step " + step, Old: fmt.Sprint(s.Editions[step], " in the appendix"), New: fmt.Sprint(now[step], " in this program")}
		}
	}
	old, err := s.Results()
	if err != nil {
		return "", &run.Difference{Where: "values of the appendix", Old: "values that can be read", New: err.Error()}
	}
	if old.Code.Results == fresh.Code.Results && s.Code.Inputs != fresh.Code.Inputs {
		return "", &run.Difference{Where: "inputs or settings (the results are the same)", Old: s.Code.Inputs, New: fresh.Code.Inputs}
	}
	return run.Compare(old, fresh)
}

// Results gives the values of the appendix, to nine digits.
func (s *Stamp) Results() (*run.Results, error) {
	raw, err := base64.StdEncoding.DecodeString(s.Values)
	if err != nil {
		return nil, err
	}
	z, err := gzip.NewReader(bytes.NewReader(raw))
	if err != nil {
		return nil, err
	}
	b, err := io.ReadAll(z)
	if err != nil {
		return nil, err
	}
	var v values
	if err := json.Unmarshal(b, &v); err != nil {
		return nil, err
	}
	return v.results(s.Code)
}

// results brings the values back into the form that Compare takes.
func (v values) results(code run.Code) (*run.Results, error) {
	out := &run.Results{Code: code}
	for _, one := range v.Candidates {
		c := run.Candidate{Site: one.Site, Plant: one.Plant, Status: one.Status, Habitat: one.Habitat}
		if one.Turbines != nil {
			if *one.Turbines < 0 || *one.Turbines > 1_000_000 {
				return nil, fmt.Errorf("%s: %d turbines", c.ID(), *one.Turbines)
			}
			c.Fit = &run.Fit{Turbines: make([]geo.LonLat, *one.Turbines)}
		}
		for _, f := range one.Consequences {
			if f.Key < 0 || f.Key >= len(v.Keys) || f.State > scoring.NotAssessed {
				return nil, fmt.Errorf("%s: a consequence has no name or no state", c.ID())
			}
			q := scoring.Consequence{Key: v.Keys[f.Key], State: f.State, Why: f.Why}
			if f.State == scoring.Number {
				var err error
				if q.Central, err = f.Central.Float64(); err != nil {
					return nil, fmt.Errorf("%s, %s: %w", c.ID(), q.Key, err)
				}
				q.Low, q.High = q.Central, q.Central
				for _, p := range []struct {
					from json.Number
					to   *float64
				}{{f.Low, &q.Low}, {f.High, &q.High}} {
					if p.from == "" {
						continue
					}
					if *p.to, err = p.from.Float64(); err != nil {
						return nil, fmt.Errorf("%s, %s: %w", c.ID(), q.Key, err)
					}
				}
			}
			c.Consequences = append(c.Consequences, q)
		}
		out.Candidates = append(out.Candidates, c)
	}
	for _, s := range v.Voices {
		o := run.VoiceOrder{Voice: s.Voice, HeldBack: s.Held}
		for _, b := range s.Beside {
			score, err := b.Score.Float64()
			if err != nil {
				return nil, fmt.Errorf("voice %s, %s: %w", s.Voice, b.ID, err)
			}
			o.Beside = append(o.Beside, run.Beside{ID: b.ID, Why: b.Why, Place: b.Place, Score: score})
		}
		for _, r := range s.Order {
			score, err := r.Score.Float64()
			if err != nil {
				return nil, fmt.Errorf("voice %s: %w", s.Voice, err)
			}
			o.Order = append(o.Order, run.Row{Site: r.Site, Plant: r.Plant, Tier: r.Tier, Score: score})
		}
		out.Voices = append(out.Voices, o)
	}
	return out, nil
}
