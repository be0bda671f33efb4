package files

import (
	"archive/zip"
	"bytes"
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"groundtally/app/study"
)

// workbook makes a workbook of one sheet whose cells are texts or numbers.
func workbook(t *testing.T, rows ...[]string) []byte {
	t.Helper()
	var sheet strings.Builder
	sheet.WriteString(`<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>`)
	for i, r := range rows {
		sheet.WriteString("<row>")
		for _, cell := range r {
			if i == 0 {
				sheet.WriteString(`<c t="inlineStr"><is><t>` + cell + `</t></is></c>`)
			} else {
				sheet.WriteString(`<c><v>` + cell + `</v></c>`)
			}
		}
		sheet.WriteString("</row>")
	}
	sheet.WriteString("</sheetData></worksheet>")
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	for _, m := range [][2]string{
		{"[Content_Types].xml", `<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types"><Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/><Override PartName="/xl/workbook.xml" ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.sheet.main+xml"/></Types>`},
		{"_rels/.rels", `<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="r1" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/officeDocument" Target="xl/workbook.xml"/></Relationships>`},
		{"xl/workbook.xml", `<workbook xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main" xmlns:r="http://schemas.openxmlformats.org/officeDocument/2006/relationships"><sheets><sheet name="Curve" sheetId="1" r:id="r1"/></sheets></workbook>`},
		{"xl/_rels/workbook.xml.rels", `<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships"><Relationship Id="r1" Type="http://schemas.openxmlformats.org/officeDocument/2006/relationships/worksheet" Target="worksheets/sheet1.xml"/></Relationships>`},
		{"xl/worksheets/sheet1.xml", sheet.String()},
	} {
		w, err := z.Create(m[0])
		if err != nil {
			t.Fatal(err)
		}
		if _, err := w.Write([]byte(m[1])); err != nil {
			t.Fatal(err)
		}
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

// The same curve comes out of every form in which people have it.
func TestCurvesFromFiles(t *testing.T) {
	want := []study.CurvePoint{{SpeedMPerS: 3.5, PowerKW: 20.5, Ct: 0.82, HasCt: true}, {SpeedMPerS: 4, PowerKW: 60, Ct: 0.8, HasCt: true}, {SpeedMPerS: 12, PowerKW: 1000, Ct: 0.4, HasCt: true}}
	for name, content := range map[string][]byte{
		"comma.csv":     []byte("wind speed (m/s),power (kW),Ct\n3.5,20.5,0.82\n4,60,0.8\n12,1000,0.4\n"),
		"semicolon.csv": []byte("\xef\xbb\xbfv [m/s];P [kW];Ct\r\n3,5;20,5;0,82\r\n4;60;0,8\r\n12;1000;0,4\r\n"),
		"sep.csv":       []byte("sep=;\nv [m/s];P [W];Ct\n3,5;20500;0,82\n4,0;60000;0,80\n12;1000000;0,4\n"),
		"tab.tsv":       []byte("Ct\tPotencia (MW)\tVelocidad del viento (m/s)\n0.82\t0.0205\t3.5\n0.8\t0.06\t4\n0.4\t1\t12\n"),
		"zeros.csv":     []byte("v [m/s];P [kW];Ct\n03,5;0020,5;0,82\n04,0;0060;0,8\n12;1000;0,4\n"),
		"book.xlsx":     workbook(t, []string{"Windgeschwindigkeit [m/s]", "Leistung [kW]", "Schubbeiwert"}, []string{"3.5", "20.5", "0.82"}, []string{"4", "60", "0.8"}, []string{"12", "1000", "0.4"}),
	} {
		path := filepath.Join(t.TempDir(), name)
		if err := os.WriteFile(path, content, 0o600); err != nil {
			t.Fatal(err)
		}
		in, err := Import(context.Background(), path, study.ReadOptions{CRSGiven: true})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		got, err := study.ReadCurve(in, study.CurveOptions{})
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if len(got.Points) != len(want) {
			t.Errorf("%s: %v", name, got.Points)
			continue
		}
		for i, p := range got.Points {
			if p != want[i] {
				t.Errorf("%s: point %d is %+v, want %+v", name, i+1, p, want[i])
			}
		}
	}
	var f *study.FileError
	if _, err := study.ReadCurve(study.Import{File: "grid.asc"}, study.CurveOptions{}); !errors.As(err, &f) {
		t.Errorf("a grid: %v", err)
	}
}
