package term

import (
	"fmt"
	"sort"
	"strings"
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

// usageError is wrong usage: exit code 2.
type usageError struct{ text string }

func (e *usageError) Error() string { return e.text }

func usagef(format string, args ...any) error { return &usageError{fmt.Sprintf(format, args...)} }

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
		case i+1 < len(words):
			i++
			a.values[name] = append(a.values[name], words[i])
		default:
			return a, usagef("option --%s needs %s", name, o.value)
		}
	}
	return a, nil
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
