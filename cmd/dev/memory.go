package main

import (
	"fmt"
	"io"
	"io/fs"
	"path"
	"strings"

	"groundtally/assets/citedtable"
)

// memoryFolders hold the cited tables: what ships and what the tests expect.
var memoryFolders = []string{"assets/params", "testdata/check"}

// memory lists the rows of the cited tables that rest on memory, and gives how many.
func memory(fsys fs.FS, out io.Writer) (rows int, err error) {
	tables, all := 0, 0
	for _, folder := range memoryFolders {
		err := fs.WalkDir(fsys, folder, func(p string, d fs.DirEntry, err error) error {
			if err != nil || d.IsDir() || path.Ext(p) != ".csv" {
				return err
			}
			t, err := citedtable.ParseFS(fsys, p)
			if err != nil {
				return err
			}
			tables++
			all += len(t.Rows)
			for _, r := range t.Rows {
				if r.Provenance != citedtable.Memory {
					continue
				}
				rows++
				fmt.Fprintf(out, "%s:%d: %s; source: %s\n", p, r.Line, describe(t, r), r.Source)
			}
			return nil
		})
		if err != nil {
			return rows, fmt.Errorf("list what rests on memory: %w", err)
		}
	}
	fmt.Fprintf(out, "%d of %d rows in %d tables rest on memory\n", rows, all, tables)
	return rows, nil
}

// describe gives the first cells of a row with their columns, enough to know it by.
func describe(t *citedtable.Table, r citedtable.Row) string {
	const shown = 4
	var parts []string
	for _, c := range t.Columns[:len(t.Columns)-2] { // without source and provenance
		if v := r.Text(c); v != "" && len(parts) < shown {
			parts = append(parts, c+" "+v)
		}
	}
	return strings.Join(parts, ", ")
}
