package xlsx

import (
	"math"
	"strings"
	"time"
)

// epoch is the day from which a workbook counts.
type epoch uint8

const (
	since1900 epoch = iota
	since1904
)

// dateForm says how a number is shown, as far as dates are concerned.
type dateForm uint8

const (
	notDate dateForm = iota
	date             // a day
	moment           // a day and a time
	clock            // a time of day
	elapsed          // a length of time, which is a quantity: days
)

// builtIn gives the form of the numbers of formats that every workbook has without naming them.
func builtIn(id int) dateForm {
	switch {
	case id == 22:
		return moment
	case id >= 14 && id <= 17, id >= 27 && id <= 31, id == 36, id >= 50 && id <= 54, id == 57, id == 58:
		return date
	case id >= 18 && id <= 21, id >= 32 && id <= 35, id == 45, id == 47, id == 55, id == 56:
		return clock
	case id == 46:
		return elapsed
	}
	return notDate
}

// formOf reads a format such as "dd.mm.yyyy hh:mm": the letters of days and times outside of quotes,
// brackets and escapes. The first section counts, which is for positive numbers.
func formOf(code string) dateForm {
	var letters strings.Builder
	long := false
	runes := []rune(strings.ToLower(code))
scan:
	for i := 0; i < len(runes); i++ {
		switch c := runes[i]; c {
		case ';':
			break scan
		case '"':
			for i++; i < len(runes) && runes[i] != '"'; i++ {
			}
		case '\\', '_', '*':
			i++
		case '[':
			from := i + 1
			for i++; i < len(runes) && runes[i] != ']'; i++ {
			}
			if in := string(runes[from:min(i, len(runes))]); in != "" && (strings.Trim(in, "h") == "" || strings.Trim(in, "m") == "" || strings.Trim(in, "s") == "") {
				long = true
			}
		default:
			letters.WriteRune(c)
		}
	}
	s := letters.String()
	s = strings.NewReplacer("am/pm", "", "a/p", "", "general", "", "standard", "").Replace(s)
	switch {
	case long:
		return elapsed
	case strings.ContainsAny(s, "#?@"):
		return notDate
	case strings.ContainsAny(s, "yd") && strings.ContainsAny(s, "hs"):
		return moment
	case strings.ContainsAny(s, "yd"):
		return date
	case strings.ContainsAny(s, "hs"):
		return clock
	case strings.Contains(s, "m"):
		return date
	}
	return notDate
}

const lastDay = 2_958_466 // behind 9999-12-31, counted from 1900

// text gives a date in ISO form, or false where the number stays a number. A day that has a time gets it even
// where it is not shown.
func (f dateForm) text(days float64, from epoch) (string, bool) {
	if f == notDate || f == elapsed || days < 0 {
		return "", false
	}
	day, part := math.Modf(days)
	millis := math.Round(part * 86_400_000)
	if millis >= 86_400_000 {
		day, millis = day+1, 0
	}
	at := time.UnixMilli(int64(millis)).UTC()
	layout := "15:04:05"
	if at.Nanosecond() != 0 {
		layout = "15:04:05.000"
	}
	hours := at.Format(layout)
	if day == 0 && (f == clock || from == since1900) {
		return hours, true
	}
	if from == since1904 {
		day += 1462
	}
	if day >= lastDay {
		return "", false
	}
	iso := ""
	switch {
	case day == 60:
		iso = "1900-02-29" // a day that these workbooks have, though there was none
	case day < 60:
		iso = time.Date(1899, 12, 31+int(day), 0, 0, 0, 0, time.UTC).Format(time.DateOnly)
	default:
		iso = time.Date(1899, 12, 30+int(day), 0, 0, 0, 0, time.UTC).Format(time.DateOnly)
	}
	if millis == 0 && f == date {
		return iso, true
	}
	return iso + "T" + hours, true
}
