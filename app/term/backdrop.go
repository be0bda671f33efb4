package term

import (
	"errors"

	"groundtally/app/study"
	"groundtally/geo/formats"
)

// onlyBackdrop asks whether a picture is meant as one.
func onlyBackdrop(file string) error {
	return &study.QuestionError{File: file, Questions: []study.Question{{Text: "it is a picture, which can only be a backdrop: drawn under the map, and counted for nothing. Is it meant so?", Option: "--as backdrop"}}}
}

// addBackdrop adds a picture, with people to be named, which no other layer has.
func (c *call) addBackdrop() (int, error) {
	file := c.args.places[1]
	for _, o := range []string{"match", "unit", "personal", "only", "at", "swap-axes", "complete", "table"} {
		if c.args.has(o) {
			return 0, usagef("--%s is not for a backdrop", o)
		}
	}
	return c.with(func(s *study.Study) (int, error) {
		in, err := c.ReadFile(c.ctx, file, study.ReadOptions{CRSGiven: c.args.has("crs")})
		if err != nil {
			return 0, err
		}
		in.Name, in.CRSOption, in.Replace = c.args.get("name"), c.args.get("crs"), c.args.get("replace")
		in.Edition, in.Holder, in.Reason = c.args.get("edition"), c.args.get("holder"), c.args.get("reason")
		tools, done := c.Tools()
		defer done()
		r, err := s.AddBackdrop(c.ctx, in, study.Credit{Attribution: c.args.get("attribution"), Licence: c.args.get("licence")}, tools)
		var form *formats.Error
		if errors.As(err, &form) {
			return 0, &study.FileError{File: file, Where: form.Where, What: form.What, Cure: form.Do}
		}
		if err != nil {
			return 0, err
		}
		licence := r.Credit().Licence
		if licence == "" {
			licence = "not stated"
		}
		c.answer(map[string]any{"study": c.args.places[0], "layer": r}, "%s as backdrop: kept as it stands, %d kB; %s; licence: %s.", r.Name, (len(in.Blob)+1023)/1024, r.Credit().Attribution, licence)
		c.notices(r.Notices)
		return ExitDone, nil
	})
}
