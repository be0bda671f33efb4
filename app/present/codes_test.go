package present

import (
	"go/ast"
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"groundtally/geo"
	"groundtally/scoring"
)

// code is the form of a notice or reason code.
var code = regexp.MustCompile(`^[a-z]+(_[a-z0-9]+)+$`)

// sources parses every Go file of the program that is no test, below the folders that give codes.
func sources(t *testing.T, folders ...string) []*ast.File {
	t.Helper()
	set := token.NewFileSet()
	var out []*ast.File
	for _, folder := range folders {
		err := fs.WalkDir(os.DirFS("../.."), folder, func(path string, d fs.DirEntry, err error) error {
			if err != nil || d.IsDir() || !strings.HasSuffix(path, ".go") || strings.HasSuffix(path, "_test.go") {
				return err
			}
			f, err := parser.ParseFile(set, filepath.Join("../..", path), nil, 0)
			out = append(out, f)
			return err
		})
		if err != nil {
			t.Fatal(err)
		}
	}
	return out
}

func text(e ast.Expr) string {
	if b, ok := e.(*ast.BinaryExpr); ok { // "no_layer:" + role
		return text(b.X)
	}
	l, ok := e.(*ast.BasicLit)
	if !ok || l.Kind != token.STRING {
		return ""
	}
	s, err := strconv.Unquote(l.Value)
	if err != nil {
		return ""
	}
	return s
}

func name(e ast.Expr) string {
	switch v := e.(type) {
	case *ast.Ident:
		return v.Name
	case *ast.SelectorExpr:
		return v.Sel.Name
	}
	return ""
}

// TestEveryNoticeHasASentence walks the source for codes of notices and asks for a sentence for each.
func TestEveryNoticeHasASentence(t *testing.T) {
	found := map[string]bool{}
	put := func(s string) {
		if code.MatchString(s) {
			found[s] = true
		}
	}
	for _, f := range sources(t, "app/run", "app/study", "app/files", "geo", "scoring/wind") {
		ast.Inspect(f, func(n ast.Node) bool {
			switch v := n.(type) {
			case *ast.CompositeLit:
				isNotice := name(v.Type) == "Notice" || name(v.Type) == "event"
				for _, e := range v.Elts {
					if kv, ok := e.(*ast.KeyValueExpr); ok && isNotice && strings.EqualFold(name(kv.Key), "code") {
						put(text(kv.Value))
					}
				}
				if m, ok := v.Type.(*ast.MapType); ok && name(m.Value) == "Severity" {
					for _, e := range v.Elts {
						put(text(e.(*ast.KeyValueExpr).Key))
					}
				}
			case *ast.CallExpr:
				switch name(v.Fun) {
				case "note":
					if len(v.Args) > 0 {
						put(text(v.Args[0]))
					}
				case "put": // app/run: a leaf, then its codes
					for _, a := range v.Args[min(1, len(v.Args)):] {
						put(text(a))
					}
				case "append":
					if len(v.Args) > 1 && (name(v.Args[0]) == "Notices" || name(v.Args[0]) == "notApplied") {
						for _, a := range v.Args[1:] {
							put(text(a))
						}
					}
				}
			case *ast.AssignStmt:
				if i, ok := v.Lhs[0].(*ast.IndexExpr); ok && (name(i.X) == "codes" || name(i.X) == "notices") {
					put(text(i.Index))
				}
			case *ast.ValueSpec:
				if name(v.Type) == "Notice" && len(v.Values) == 1 {
					put(text(v.Values[0]))
				}
			}
			return true
		})
	}
	if len(found) < 50 {
		t.Fatalf("only %d codes were found in the source; the walk is broken", len(found))
	}
	for c := range found {
		if _, ok := sentences[c]; !ok {
			t.Errorf("notice %q has no sentence", c)
		}
	}
}

// TestEveryReasonHasWords walks the source for reasons of states and of connections.
func TestEveryReasonHasWords(t *testing.T) {
	found := map[string]bool{}
	for _, f := range sources(t, "app/run", "scoring") {
		ast.Inspect(f, func(n ast.Node) bool {
			switch v := n.(type) {
			case *ast.CallExpr:
				switch name(v.Fun) {
				case "UnknownBecause", "NoneBecause", "Guarded", "guarded":
					if len(v.Args) > 0 {
						found[text(v.Args[0])] = true
					}
				}
			case *ast.AssignStmt:
				for i, l := range v.Lhs {
					if n := name(l); (n == "Reason" || n == "Why" || n == "why") && i < len(v.Rhs) {
						found[text(v.Rhs[i])] = true
					}
				}
			case *ast.ReturnStmt: // spareFor
				for _, r := range v.Results {
					if s := text(r); s == "spare_unknown" {
						found[s] = true
					}
				}
			case *ast.ValueSpec:
				if name(v.Type) == "Reason" && len(v.Values) == 1 {
					found[text(v.Values[0])] = true
				}
			}
			return true
		})
	}
	if len(found) < 35 {
		t.Fatalf("only %d reasons were found in the source; the walk is broken: %v", len(found), found)
	}
	for c := range found {
		head, _, colon := strings.Cut(c, ":")
		switch {
		case c == "" || strings.Contains(c, " "): // plain words already
		case colon && prefixed[head] != "":
		case !colon && reasons[c] != "":
		default:
			t.Errorf("reason %q has no words", c)
		}
	}
}

func TestReason(t *testing.T) {
	for in, want := range map[string]string{
		"no_layer:soil":                           "the study has no layer of soil",
		"no_layer:grid_lines|substations":         "the study has no layer of grid lines or of substations",
		"layer_not_complete:water_protection":     "nothing was found, and no layer of water protection is declared complete for the place",
		"not_set:plant.wind_large.fit_machines":   "the setting plant.wind_large.fit_machines must be entered first",
		"energy.household_mwh_per_yr":             "the setting energy.household_mwh_per_yr must be entered first",
		"missing_value:soil.organic_carbon_stock": "features of the layer lack the value they need: soil, organic carbon stock",
		"no rotor":           "no rotor",
		"a_code_of_tomorrow": "a code of tomorrow",
	} {
		if got := Reason(in); got != want {
			t.Errorf("Reason(%q) = %q, want %q", in, got, want)
		}
	}
}

func TestWhyNotTellsTheStateInWords(t *testing.T) {
	for state, want := range map[scoring.State]string{
		scoring.Unknown: "unknown: ", scoring.NotSet: "not set: ", scoring.None: "none: ", scoring.Never: "never: ", scoring.NotAssessed: "not assessed: ",
	} {
		if got := WhyNot(scoring.Consequence{State: state, Why: "no_layer:soil"}); !strings.HasPrefix(got, want) {
			t.Errorf("state %v reads %q", state, got)
		}
	}
	if got := WhyNot(scoring.Consequence{Central: 1}); got != "" {
		t.Errorf("a number has the reason %q", got)
	}
}

// TestWordsArePlain holds the texts to plain writing: no dashes of typography, no codes left in them.
func TestWordsArePlain(t *testing.T) {
	check := func(code, s string) {
		if strings.ContainsAny(s, "–—") {
			t.Errorf("%s: typographic dash in %q", code, s)
		}
		if strings.TrimSpace(s) == "" {
			t.Errorf("%s has no text", code)
		}
	}
	for c, s := range sentences {
		check(c, s)
		if s != "{error}" && !strings.HasSuffix(s, ".") && !strings.HasSuffix(s, "}") {
			t.Errorf("%s: %q does not end as a sentence", c, s)
		}
	}
	for _, m := range []map[string]string{reasons, prefixed, steps, named} {
		for c, s := range m {
			check(c, s)
			if strings.HasSuffix(s, ".") {
				t.Errorf("%s: %q is used inside sentences and must not end in a full stop", c, s)
			}
		}
	}
}

func TestSentenceFillsItsArguments(t *testing.T) {
	got := Sentence("repaired", map[string]string{"area_before_ha": "2.0", "area_after_ha": "1.9"})
	if strings.ContainsAny(got, "{}") || !strings.Contains(got, "from 2.0 ha to 1.9 ha") {
		t.Errorf("Sentence = %q", got)
	}
	if got := Sentence("a_code_of_tomorrow", map[string]string{"b": "2", "a": "1"}); got != "a code of tomorrow; a 1; b 2" {
		t.Errorf("a code without a text reads %q", got)
	}
}

func TestNoticesPlaceWithoutSigns(t *testing.T) {
	got := Notice(geo.Notice{Code: "no_geometry", Feature: "7", At: &geo.LonLat{Lon: -27.0737, Lat: 47.45733}})
	if !strings.Contains(got, "near 47.45733 N, 27.07370 W:") {
		t.Errorf("the notice says %q", got)
	}
	got = Notice(geo.Notice{Code: "no_geometry", Feature: "7", At: &geo.LonLat{Lon: 18.5, Lat: -33.9}})
	if !strings.Contains(got, "near 33.90000 S, 18.50000 E:") {
		t.Errorf("the notice says %q", got)
	}
}

func TestSidesOfALayerHaveLetters(t *testing.T) {
	got := Notice(geo.Notice{Code: "layer_apart", Layer: "far", Args: map[string]string{"west": "-27.1000", "south": "-3.0000", "east": "2.5000", "north": "4.0000"}})
	if !strings.Contains(got, "(27.10000 W to 2.50000 E, 3.00000 S to 4.00000 N)") {
		t.Errorf("the notice says %q", got)
	}
}
