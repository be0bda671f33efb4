package csvtable

import (
	"math"
	"strconv"
	"strings"
)

// form is how a cell can be read as a number.
type form uint8

const (
	notNumber form = iota
	emptyCell
	wholeForm     // 12, -3
	pointForm     // 1.5, 1e-3: a decimal point and nothing else
	commaForm     // 1,5 or 0,123: a decimal comma and nothing else
	pointOrGroups // 1.234: a decimal point, or groups where the comma is decimal
	commaOrGroups // 1,234: a decimal comma or groups
	groupsForm    // 1,234,567 or 1 234 or 1'234.5: groups in any reading
	zerosForm     // 007: a text whose zeros count
	longForm      // a whole number that no double holds exactly
	boolForm      // true, false
)

// formOf classes a cell by its characters alone.
func formOf(s string) form {
	s = strings.TrimSpace(s)
	if s == "" {
		return emptyCell
	}
	if strings.EqualFold(s, "true") || strings.EqualFold(s, "false") {
		return boolForm
	}
	t := strings.TrimLeft(s, "+-")
	if len(s)-len(t) > 1 || t == "" {
		return notNumber
	}
	// split into runs of digits and what stands between them
	var digits []string
	var marks []rune
	exponent := false
	start := 0
	for i, c := range t {
		if c >= '0' && c <= '9' {
			continue
		}
		if (c == 'e' || c == 'E') && i > 0 {
			exp := strings.TrimLeft(t[i+1:], "+-")
			if len(t[i+1:])-len(exp) > 1 || !allDigits(exp) {
				return notNumber
			}
			exponent = true
			digits = append(digits, t[start:i])
			start = -1
			break
		}
		digits = append(digits, t[start:i])
		marks = append(marks, c)
		start = i + len(string(c))
	}
	if start >= 0 {
		digits = append(digits, t[start:])
	}
	for i, d := range digits {
		if d == "" && (i > 0 || len(marks) != 1 || marks[0] != '.' && marks[0] != ',') {
			return notNumber
		}
	}
	if !finiteNumber(strings.ReplaceAll(s, ",", ".")) && len(marks) < 2 && (len(marks) == 0 || marks[0] == '.' || marks[0] == ',') {
		return notNumber
	}
	zeros := len(digits[0]) > 1 && digits[0][0] == '0'
	switch {
	case len(marks) == 0 && zeros:
		return zerosForm
	case len(marks) == 0 && exponent:
		return pointForm
	case len(marks) == 0:
		if v, err := strconv.ParseInt(s, 10, 64); err != nil || v > 1<<53 || v < -1<<53 {
			return longForm
		}
		return wholeForm
	case len(marks) == 1 && (marks[0] == '.' || marks[0] == ','):
		grouped := !zeros && digits[0] != "" && digits[0] != "0" && len(digits[0]) <= 3 && len(digits[1]) == 3 && !exponent
		switch {
		case zeros:
			return zerosForm
		case marks[0] == '.' && grouped:
			return pointOrGroups
		case marks[0] == '.':
			return pointForm
		case grouped:
			return commaOrGroups
		}
		return commaForm
	}
	return groups(digits, marks, exponent)
}

// groups tells whether the digits stand in groups of three, the last mark perhaps a decimal one.
func groups(digits []string, marks []rune, exponent bool) form {
	sep := marks[0]
	if !strings.ContainsRune(",.' \u00a0\u2009\u202f\u2019", sep) || exponent || len(digits[0]) == 0 || len(digits[0]) > 3 {
		return notNumber
	}
	for i, m := range marks {
		last := i == len(marks)-1
		if m != sep && !(last && (m == '.' || m == ',')) {
			return notNumber
		}
		if m == sep && len(digits[i+1]) != 3 {
			return notNumber
		}
	}
	return groupsForm
}

func allDigits(s string) bool {
	if s == "" {
		return false
	}
	for _, c := range s {
		if c < '0' || c > '9' {
			return false
		}
	}
	return true
}

func finiteNumber(s string) bool {
	v, err := strconv.ParseFloat(s, 64)
	return err == nil && !math.IsInf(v, 0) && !math.IsNaN(v)
}

// numeric tells whether a column made of such forms may be a column of numbers.
func (f form) numeric() bool { return f != notNumber && f != boolForm }

func parse(s string, d Decimal) (float64, bool) {
	s = strings.TrimSpace(s)
	if d == Comma {
		s = strings.Replace(s, ",", ".", 1)
	}
	v, err := strconv.ParseFloat(s, 64)
	return v, err == nil && !math.IsInf(v, 0) && !math.IsNaN(v)
}
