package core

import "strconv"

// Count writes a whole number with its thousands apart, as present.Figure does, but never rounded.
func Count(n int) string {
	s := strconv.Itoa(n)
	sign := ""
	if n < 0 {
		sign, s = "-", s[1:]
	}
	if len(s) <= 4 {
		return sign + s
	}
	out := s[:(len(s)-1)%3+1]
	for i := len(out); i < len(s); i += 3 {
		out += " " + s[i:i+3]
	}
	return sign + out
}

// Counted writes a number of things: "1 layer", "18 layers".
func Counted(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return Count(n) + " " + many
}
