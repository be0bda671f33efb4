package citedtable

import (
	"errors"
	"strings"
	"testing"
)

func TestParseRefusesRowsWithoutSource(t *testing.T) {
	_, err := Parse("t", strings.NewReader("a,source,provenance\n1,,read\n"))
	if !errors.Is(err, ErrNoSource) {
		t.Fatalf("got %v, want ErrNoSource", err)
	}
	if _, err := Parse("t", strings.NewReader("a,source,provenance\n1,book,hearsay\n")); err == nil {
		t.Fatal("an unknown provenance was accepted")
	}
	if _, err := Parse("t", strings.NewReader("a,b\n1,2\n")); err == nil {
		t.Fatal("a table without source columns was accepted")
	}
}

func TestChecks(t *testing.T) {
	tab, err := Parse("t", strings.NewReader("# note\ncheck,quantity,inputs,expected,tolerance,source,provenance\nc1,double,x=2;unit=m,4,1e-3 rel,book,derived\n"))
	if err != nil {
		t.Fatal(err)
	}
	cs, err := tab.Checks()
	if err != nil {
		t.Fatal(err)
	}
	c := cs[0]
	if c.In["x"] != 2 || c.Text["unit"] != "m" || !c.OK(4.003) || c.OK(4.005) {
		t.Fatalf("wrong check %+v", c)
	}
}

func TestRowFloatRefusesNaN(t *testing.T) {
	tab, err := Parse("t", strings.NewReader("a,source,provenance\nNaN,book,read\n"))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := tab.Rows[0].Float("a"); err == nil {
		t.Fatal("NaN was accepted")
	}
}
