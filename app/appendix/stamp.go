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

	"groundtally/app/run"
	"groundtally/app/study"
)

// StampFile is the file beside the page that verify reads.
const StampFile = "check-code.json"

// Stamp says what an appendix was made from and what it found. Values holds the results themselves,
// compressed, so that a later run can be compared value by value.
type Stamp struct {
	Program  string         `json:"program"`
	Code     run.Code       `json:"code"`
	Editions map[string]int `json:"formula_editions"`
	Values   string         `json:"values"`
}

type values struct {
	Candidates []run.Candidate
	Voices     []run.VoiceOrder
}

// NewStamp makes the stamp of results. The same results give the same bytes.
func NewStamp(r *run.Results, version string) Stamp {
	var b bytes.Buffer
	w := gzip.NewWriter(&b)
	// Writing to memory cannot fail, and every part of a result has a JSON form.
	_ = json.NewEncoder(w).Encode(values{r.Candidates, r.Voices})
	_ = w.Close()
	return Stamp{Program: version, Code: r.Code, Editions: run.Editions(), Values: base64.StdEncoding.EncodeToString(b.Bytes())}
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
	for _, step := range []string{"ground", "fit", "candidate", "order"} {
		if s.Editions[step] != now[step] {
			return "", &run.Difference{Where: "formula edition of the step " + step, Old: fmt.Sprint(s.Editions[step], " in the appendix"), New: fmt.Sprint(now[step], " in this program")}
		}
	}
	old, err := s.results()
	if err != nil {
		return "", &run.Difference{Where: "values of the appendix", Old: "readable", New: err.Error()}
	}
	if old.Code.Results == fresh.Code.Results && s.Code.Inputs != fresh.Code.Inputs {
		return "", &run.Difference{Where: "inputs or settings (the results are the same)", Old: s.Code.Inputs, New: fresh.Code.Inputs}
	}
	return run.Compare(old, fresh)
}

func (s *Stamp) results() (*run.Results, error) {
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
	return &run.Results{Candidates: v.Candidates, Voices: v.Voices, Code: s.Code}, nil
}
