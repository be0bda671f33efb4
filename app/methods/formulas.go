package methods

import (
	"regexp"
	"slices"
	"strings"

	"groundtally/app/run"
	"groundtally/scoring"
)

// Formula is how one consequence is reckoned.
type Formula struct {
	Key, Title, Unit string
	Text             string // in the titles of what goes into it, and in signs
	Source           string
}

// Formulas lists the formulas in force of an account, in the order of the vocabulary, and the consequences of it that
// are measured on the layers or found by fitting and so have none.
func Formulas(p *run.Params, a scoring.Account) (out []Formula, measured []run.KeyInfo) {
	for _, k := range p.Keys() {
		if k.Account != a || k.Derived {
			continue
		}
		if q, ok := p.Graph.Quantity(k.Key); ok {
			out = append(out, Formula{Key: k.Key, Title: k.Title, Unit: k.Unit, Text: inWords(p, q), Source: q.Source})
		} else if _, ok := p.Graph.Slot(k.Key); ok {
			measured = append(measured, k)
		}
	}
	return out, measured
}

var inputInText = regexp.MustCompile(`[a-z][a-z0-9]*(?:_[a-z0-9]+)+`)

// inWords puts titles in place of the inputs that a formula names, in full or by their beginning.
func inWords(p *run.Params, q scoring.Quantity) string {
	title := func(name string) string {
		if in, ok := p.Graph.Quantity(name); ok {
			return in.Title
		}
		if in, ok := p.Graph.Leaf(name); ok && in.Kind != scoring.FactorLeaf {
			return in.Title
		}
		return ""
	}
	return inputInText.ReplaceAllStringFunc(q.Formula, func(word string) string {
		name := ""
		for _, in := range q.Inputs {
			if in == word {
				name = in
				break
			}
			if strings.HasPrefix(in, word+"_") {
				name = in
			}
		}
		if t := title(name); t != "" {
			return "'" + t + "'"
		}
		return word
	})
}

// Sign is what stands for a quantity in the formulas.
type Sign struct {
	Sign, Words string
	of          string // the quantity whose title and formula are the words
}

// Signs explains the signs of an account's formulas, and those of what explains them.
func Signs(p *run.Params, formulas []Formula) (out []Sign) {
	var texts []string
	for _, f := range formulas {
		texts = append(texts, f.Text)
	}
	for _, s := range signs {
		if !slices.ContainsFunc(texts, func(t string) bool { return hasSign(t, s.Sign) }) {
			continue
		}
		if q, ok := p.Graph.Quantity(s.of); ok {
			s.Words = q.Title + ": " + inWords(p, q)
		}
		texts = append(texts, s.Words)
		out = append(out, s)
	}
	return out
}

// signs stand before those that explain them.
var signs = []Sign{
	{Sign: "E_del", of: "delivered_mj_life"},
	{Sign: "E_gen", of: "generated_mj_life"},
	{Sign: "E_stocks", of: "stock_mj"},
	{Sign: "E_first year", Words: "Electricity of the first year at the grid"},
	{Sign: "I_extended", of: "input_extended_mj"},
	{Sign: "I_delivered", of: "input_delivered_mj"},
	{Sign: "I_connection", of: "input_connection_mj"},
	{Sign: "I_plant", of: "input_plant_mj"},
	{Sign: "I_upkeep", of: "input_upkeep_mj_per_yr"},
	{Sign: "E", Words: "Yearly energy, even odds"},
	{Sign: "z", Words: "Standard normal value of the odds"},
	{Sign: "σ", Words: "Standard deviation of the yearly energy"},
	{Sign: "Y1", Words: "Energy of the first year of a technology, kWh"},
	{Sign: "D", Words: "Years of life, counted in years of the first year's output: (1 − (1−d)^T)/d"},
	{Sign: "d", Words: "Ageing in a year"},
	{Sign: "T", Words: "Life of the plant"},
	{Sign: "e_C", Words: "Energy content of carbon"},
	{Sign: "η_G", Words: "Grid efficiency: electricity out for each unit of primary energy in"},
	{Sign: "λ", Words: "Share lost in the connection"},
	{Sign: "λ_dist", Words: "Share lost in distribution"},
	{Sign: "ρ", Words: "Share of a saving that rebound takes back"},
	{Sign: "F_LU", Words: "Factor of ploughland in the carbon of soil"},
}

// hasSign reports whether a sign stands in a formula by itself and not as a part of a word or of another sign.
func hasSign(text, sign string) bool {
	for rest := text; ; {
		before, after, found := strings.Cut(rest, sign)
		if !found {
			return false
		}
		if !lastOfWord.MatchString(before) && !firstOfWord.MatchString(after) {
			return true
		}
		rest = after
	}
}

var lastOfWord, firstOfWord = regexp.MustCompile(`[\pL\pN_]$`), regexp.MustCompile(`^[\pL\pN_]`)
