package present

import (
	"errors"
	"io/fs"
	"strings"

	"groundtally/app/study"
)

// Problem writes an error for people in a window: what is wrong and the cure. An error that is plain
// words already stays as it is.
func Problem(err error) string {
	var file *study.FileError
	var question *study.QuestionError
	switch {
	case errors.As(err, &file):
		text := file.File
		if file.Where != "" {
			text += ", " + file.Where
		}
		return text + ": " + sentence(file.What) + cured(file.Cure)
	case errors.As(err, &question):
		var lines []string
		for _, q := range question.Questions {
			lines = append(lines, q.Text)
		}
		return question.File + ": " + strings.Join(lines, "\n")
	case errors.Is(err, study.ErrNotAStudy):
		return "The file is no study of this program. Choose a file that this program made, or make a new study."
	case errors.Is(err, study.ErrNewerStudy):
		return "The study was written by a newer version of the program. Open it with that version; it was left as it is."
	case errors.Is(err, study.ErrDamaged):
		return "The study file is damaged and cannot be used as it is. It was left untouched; open a copy of it made earlier."
	case errors.Is(err, study.ErrReadOnly):
		return "The file or its folder cannot be written. Copy the study to a folder of your own, or ask for the right to write there."
	case errors.Is(err, study.ErrDiskFull):
		return "The disk is full. Nothing was changed; make room, then do it again."
	case errors.Is(err, study.ErrBusy):
		return "Another program is changing the study. Wait until it is done, then do it again."
	case errors.Is(err, study.ErrNotThere) && strings.Contains(err.Error(), "study"):
		return "The study's file is gone: it was moved or deleted while it was open. Put it back, then do it again."
	case errors.Is(err, fs.ErrNotExist):
		return "The file is not there. It may have been moved or deleted; choose another one."
	}
	return sentence(err.Error())
}

func sentence(s string) string {
	s = strings.TrimSpace(s)
	if s == "" {
		return s
	}
	s = strings.ToUpper(s[:1]) + s[1:]
	if !strings.HasSuffix(s, ".") {
		s += "."
	}
	return s
}

func cured(cure string) string {
	if cure == "" {
		return ""
	}
	return " " + sentence(cure)
}
