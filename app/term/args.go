package term

import (
	"sort"
	"strconv"
	"strings"
	"unicode"
)

// option describes one option of a verb.
type option struct {
	name  string
	value string // what the value is called in the help; empty for a switch
	many  bool   // may be given more than once
	help  string
}

// arguments are the words after the verb, parted into places and options. Options may stand anywhere.
type arguments struct {
	places []string
	values map[string][]string
	given  map[string]bool
}

func (a arguments) has(name string) bool { return a.given[name] }

func (a arguments) get(name string) string {
	if v := a.values[name]; len(v) > 0 {
		return v[len(v)-1]
	}
	return ""
}

// parse parts words by the options a verb knows. "--" ends the options; "--name=value" and
// "--name value" are the same.
func parse(words []string, options []option) (arguments, error) {
	a := arguments{values: map[string][]string{}, given: map[string]bool{}}
	known := map[string]option{}
	for _, o := range options {
		known[o.name] = o
	}
	for i := 0; i < len(words); i++ {
		w := words[i]
		if w == "--" {
			a.places = append(a.places, words[i+1:]...)
			break
		}
		if len(w) > 1 && w[0] == '-' && unicode.IsLetter(rune(w[1])) {
			return a, usagef("there is no option %s; options begin with two dashes", w)
		}
		if !strings.HasPrefix(w, "--") {
			a.places = append(a.places, w)
			continue
		}
		name, value, inline := strings.Cut(strings.TrimPrefix(w, "--"), "=")
		o, ok := known[name]
		if !ok {
			names := make([]string, 0, len(known))
			for n := range known {
				names = append(names, "--"+n)
			}
			sort.Strings(names)
			return a, usagef("there is no option --%s; the options are %s", name, strings.Join(names, ", "))
		}
		if a.given[name] && !o.many {
			return a, usagef("option --%s is given twice", name)
		}
		a.given[name] = true
		switch {
		case o.value == "" && inline:
			return a, usagef("option --%s takes no value", name)
		case o.value == "":
		case inline:
			a.values[name] = append(a.values[name], value)
		case i+1 < len(words) && !strings.HasPrefix(words[i+1], "--"):
			i++
			a.values[name] = append(a.values[name], words[i])
		default:
			return a, usagef("option --%s needs %s after it", name, o.value)
		}
	}
	return a, nil
}

// whole reads an option that is a whole number from least on; without the option it gives fallback.
func (a arguments) whole(name string, least, fallback int) (int, error) {
	if !a.has(name) {
		return fallback, nil
	}
	n, err := strconv.Atoi(a.get(name))
	if err != nil || n < least {
		return 0, usagef("--%s wants a whole number from %d, not %q", name, least, a.get(name))
	}
	return n, nil
}

// pairs reads options of the form KEY=VALUE.
func (a arguments) pairs(name string) (map[string]string, error) {
	out := map[string]string{}
	for _, v := range a.values[name] {
		k, val, ok := strings.Cut(v, "=")
		if !ok || k == "" || val == "" {
			return nil, usagef("--%s wants NAME=VALUE, not %q", name, v)
		}
		out[k] = val
	}
	return out, nil
}
