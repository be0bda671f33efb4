package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"go/doc"
	"go/parser"
	"go/token"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"
)

const module = "groundtally"

// A listedPackage is what "go list -deps -json" tells of a package.
type listedPackage struct {
	Dir, ImportPath, Name     string
	Standard                  bool
	Module                    *struct{ Path string }
	Imports, Deps             []string
	TestImports, XTestImports []string
	GoFiles, CgoFiles         []string
	TestGoFiles, XTestGoFiles []string
	Error                     *struct{ Err string }
	DepsErrors                []*struct{ Err string }
}

func (p listedPackage) ours() bool { return p.Module != nil && p.Module.Path == module }

// short gives the path within the module.
func short(importPath string) string {
	return strings.TrimPrefix(strings.TrimPrefix(importPath, module), "/")
}

func repoRoot(t *testing.T) string {
	t.Helper()
	dir, err := os.Getwd()
	if err != nil {
		t.Fatal(err)
	}
	root, err := findRoot(dir)
	if err != nil {
		t.Fatal(err)
	}
	return root
}

// packages lists all packages of the module with everything that they reach.
func packages(t *testing.T) map[string]listedPackage {
	t.Helper()
	cmd := exec.Command("go", "list", "-e", "-deps", "-json=Dir,ImportPath,Name,Standard,Module,Imports,Deps,TestImports,XTestImports,GoFiles,CgoFiles,TestGoFiles,XTestGoFiles,Error,DepsErrors",
		"-tags", buildTags, "./...")
	cmd.Dir = repoRoot(t)
	var said bytes.Buffer
	cmd.Stderr = &said
	out, err := cmd.Output()
	if err != nil {
		t.Fatalf("%s: %v\n%s", cmd, err, said.String())
	}
	all := map[string]listedPackage{}
	dec := json.NewDecoder(bytes.NewReader(out))
	for dec.More() {
		var p listedPackage
		if err := dec.Decode(&p); err != nil {
			t.Fatal(err)
		}
		if p.ours() && p.Error != nil {
			t.Errorf("%s: %s", p.ImportPath, p.Error.Err)
		}
		if p.ours() && len(p.DepsErrors) > 0 {
			t.Errorf("%s: %s", p.ImportPath, p.DepsErrors[0].Err)
		}
		all[p.ImportPath] = p
	}
	if t.Failed() {
		t.FailNow()
	}
	return all
}

// Rules name packages of the module by their path in it ("geo/..." is geo and all below) and
// others by import path.

// A reachRule says what packages must not reach, by whatever way.
type reachRule struct {
	from []string
	not  []string
	why  string
}

var reachRules = []reachRule{
	{[]string{"geo/..."}, []string{"scoring/...", "app/...", "cmd/...", "assets", "net/http", "database/sql", "fyne.io/...", "github.com/go-gl/..."}, "geo measures and knows no energy, no files, no window"},
	{[]string{"scoring/..."}, []string{"geo/...", "app/...", "cmd/...", "assets", "net/http", "database/sql", "fyne.io/...", "github.com/go-gl/...", "github.com/twpayne/..."}, "scoring computes from plain numbers and knows no map"},
	{[]string{"assets/citedtable"}, []string{"geo/...", "scoring/...", "app/...", "cmd/...", "assets", "sampledata/..."}, "everything may read cited tables"},
	{[]string{"app/study"}, []string{"database/sql", "modernc.org/...", "fyne.io/...", "github.com/go-gl/..."}, "use cases know no SQL and no toolkit"},
	{[]string{"app/..."}, []string{"cmd/..."}, "commands stand on top"},
	{[]string{"cmd/gtally"}, []string{"net/http", "fyne.io/...", "github.com/go-gl/...", "app/desk/..."}, "the terminal program works offline and without a screen"},
	{[]string{"cmd/dev"}, []string{"github.com/...", "fyne.io/...", "modernc.org/...", "golang.org/x/...", "geo/...", "scoring/...", "app/..."}, "the set-up works before anything is installed"},
}

// A directRule says who alone may import something. With tests, test files are held to it
// too; where not, a test may look at the outside of what it tests: at a study file by SQL, at
// a port by listening whether anybody calls.
type directRule struct {
	what  []string
	only  []string
	tests bool
	why   string
}

var directRules = []directRule{
	{[]string{"github.com/twpayne/go-geos/..."}, []string{"geo/overlay"}, true, "GEOS is reached through geo/overlay"},
	{[]string{"github.com/twpayne/go-proj/..."}, []string{"geo/crs"}, true, "the projection library is reached through geo/crs"},
	{[]string{"database/sql/...", "modernc.org/sqlite/..."}, []string{"app/store/..."}, false, "SQL is reached through app/store"},
	{[]string{"fyne.io/..."}, []string{"app/desk/...", "cmd/groundtally"}, true, "the toolkit is reached through app/desk"},
	{[]string{"net", "net/http/...", "net/rpc/...", "net/smtp", "crypto/tls", "golang.org/x/net/..."}, nil, false, "the program works offline: nothing of ours dials"},
	{[]string{"geo/..."}, []string{"geo/...", "app/...", "cmd/...", "sampledata/..."}, true, "scoring knows no map"},
	{[]string{"scoring/..."}, []string{"scoring/...", "app/...", "cmd/...", "sampledata/..."}, true, "geo knows no energy"},
	{[]string{"app/..."}, []string{"app/...", "cmd/..."}, true, "geo and scoring stand below"},
}

// matches reports whether an import path falls under a pattern.
func matches(importPath, pattern string) bool {
	if p := short(importPath); p != importPath {
		importPath = p
	}
	if base, ok := strings.CutSuffix(pattern, "/..."); ok {
		return importPath == base || strings.HasPrefix(importPath, base+"/")
	}
	return importPath == pattern
}

func matchesAny(importPath string, patterns []string) bool {
	return slices.ContainsFunc(patterns, func(p string) bool { return matches(importPath, p) })
}

// breaches lists what in all goes against the rules, sorted.
func breaches(all map[string]listedPackage, reach []reachRule, direct []directRule) []string {
	var out []string
	for _, p := range all {
		if !p.ours() {
			continue
		}
		for _, r := range reach {
			if !matchesAny(p.ImportPath, r.from) {
				continue
			}
			for _, d := range p.Deps {
				if matchesAny(d, r.not) && !matchesAny(d, r.from) {
					out = append(out, fmt.Sprintf("%s reaches %s: %s", p.ImportPath, way(all, p.ImportPath, d), r.why))
				}
			}
		}
		for _, r := range direct {
			if matchesAny(p.ImportPath, r.only) {
				continue
			}
			imports := slices.Clone(p.Imports)
			if r.tests {
				imports = slices.Concat(imports, p.TestImports, p.XTestImports)
			}
			for _, i := range imports {
				if matchesAny(i, r.what) && !matches(p.ImportPath, i) {
					out = append(out, fmt.Sprintf("%s imports %s: %s", p.ImportPath, i, r.why))
				}
			}
		}
	}
	slices.Sort(out)
	return slices.Compact(out)
}

// way gives a shortest chain of imports.
func way(all map[string]listedPackage, from, to string) string {
	before := map[string]string{from: ""}
	for queue := []string{from}; len(queue) > 0; queue = queue[1:] {
		if queue[0] == to {
			break
		}
		for _, i := range all[queue[0]].Imports {
			if _, seen := before[i]; !seen {
				before[i] = queue[0]
				queue = append(queue, i)
			}
		}
	}
	chain := to
	for at := before[to]; at != "" && at != from; at = before[at] {
		chain = at + " -> " + chain
	}
	return chain
}

func TestLayers(t *testing.T) {
	all := packages(t)
	for _, b := range breaches(all, reachRules, directRules) {
		t.Error(b)
	}
}

// Each rule finds a breach made for it, so that none of them is blind.
func TestLayerRulesSee(t *testing.T) {
	name := func(pattern string) string {
		p := strings.TrimSuffix(pattern, "/...")
		if first, _, _ := strings.Cut(p, "/"); slices.Contains([]string{"geo", "scoring", "app", "cmd", "assets", "sampledata"}, first) {
			return module + "/" + p
		}
		return p
	}
	ourModule := &struct{ Path string }{module}
	for _, r := range reachRules {
		for _, from := range r.from {
			for _, not := range r.not {
				top, mid, low := name(from), "example.org/between", name(not)
				all := map[string]listedPackage{
					top: {ImportPath: top, Module: ourModule, Imports: []string{mid}, Deps: []string{mid, low}},
					mid: {ImportPath: mid, Imports: []string{low}},
					low: {ImportPath: low},
				}
				want := top + " reaches " + mid + " -> " + low
				if got := breaches(all, []reachRule{r}, nil); len(got) != 1 || !strings.HasPrefix(got[0], want) {
					t.Errorf("%s to %s: breaches %q, want %q", from, not, got, want)
				}
			}
		}
	}
	for _, r := range directRules {
		for _, what := range r.what {
			bad := module + "/elsewhere/thing"
			all := map[string]listedPackage{bad: {ImportPath: bad, Module: ourModule, XTestImports: []string{name(what)}}}
			if got := breaches(all, nil, []directRule{r}); (len(got) == 1) != r.tests {
				t.Errorf("%s in a test file: breaches %q, held in tests: %v", what, got, r.tests)
			}
			all[bad] = listedPackage{ImportPath: bad, Module: ourModule, Imports: []string{name(what)}}
			if got := breaches(all, nil, []directRule{r}); len(got) != 1 {
				t.Errorf("%s: breaches %q", what, got)
			}
			for _, only := range r.only {
				good := name(only) + "/"
				good = strings.TrimSuffix(good, "/")
				all := map[string]listedPackage{good: {ImportPath: good, Module: ourModule, Imports: []string{name(what)}}}
				if got := breaches(all, nil, []directRule{r}); len(got) != 0 {
					t.Errorf("%s may import %s, yet: %q", only, what, got)
				}
			}
		}
	}
}

// Every package says its job in a sentence.
func TestPackageDocs(t *testing.T) {
	for _, p := range packages(t) {
		if !p.ours() {
			continue
		}
		var synopsis string
		for _, f := range slices.Concat(p.GoFiles, p.CgoFiles, p.TestGoFiles, p.XTestGoFiles) {
			file, err := parser.ParseFile(token.NewFileSet(), filepath.Join(p.Dir, f), nil, parser.PackageClauseOnly|parser.ParseComments)
			if err != nil {
				t.Fatal(err)
			}
			if s := new(doc.Package).Synopsis(file.Doc.Text()); s != "" {
				synopsis = s
				break
			}
		}
		if synopsis == "" {
			t.Errorf("%s has no package comment: write one into %s", p.ImportPath, filepath.Join(short(p.ImportPath), "doc.go"))
		}
	}
}

// Everything that is compiled into a program of ours stands in the notice that ships.
func TestNoticeNamesEveryModule(t *testing.T) {
	notice, err := os.ReadFile(filepath.Join(repoRoot(t), "assets", "NOTICE"))
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(string(notice), "\n")
	all := packages(t)
	told := map[string]bool{}
	for _, program := range all {
		if !program.ours() || program.Name != "main" {
			continue
		}
		for _, dep := range program.Deps {
			p := all[dep]
			if p.Module != nil && !p.ours() && !slices.Contains(lines, p.Module.Path) && !told[p.Module.Path] {
				told[p.Module.Path] = true
				t.Errorf("assets/NOTICE has no entry for the module %s", p.Module.Path)
			}
		}
	}
	for _, want := range []string{"GEOS, geometry operations", "PROJ, map projections", "The projection database, proj.db", "Copyright (c) 2020, Alliance for Sustainable Energy, LLC", "Lato, the typeface of the window and of its pictures"} {
		if !slices.Contains(lines, want) {
			t.Errorf("assets/NOTICE has no line %q", want)
		}
	}
}

func TestLicence(t *testing.T) {
	text, err := os.ReadFile(filepath.Join(repoRoot(t), "LICENSE"))
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"Apache License", "Version 2.0, January 2004", "END OF TERMS AND CONDITIONS", "9. Accepting Warranty or Additional Liability"} {
		if !bytes.Contains(text, []byte(want)) {
			t.Errorf("LICENSE does not hold %q", want)
		}
	}
}

// kept lists the files that belong to the checkout: tracked ones and new ones that are not
// ignored. Without git, all files outside dot-folders.
func kept(t *testing.T, root string) []string {
	t.Helper()
	cmd := exec.Command("git", "-c", "safe.directory=*", "ls-files", "-z", "--cached", "--others", "--exclude-standard")
	cmd.Dir = root
	if out, err := cmd.Output(); err == nil && len(out) > 0 {
		var files []string
		for f := range strings.SplitSeq(strings.TrimSuffix(string(out), "\x00"), "\x00") {
			if info, err := os.Lstat(filepath.Join(root, filepath.FromSlash(f))); err == nil && info.Mode().IsRegular() {
				files = append(files, f) // a file may be tracked and deleted
			}
		}
		return files
	}
	t.Log("git gives no list of files; all files are looked at")
	var files []string
	err := filepath.WalkDir(root, func(p string, d os.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if d.IsDir() && p != root && strings.HasPrefix(d.Name(), ".") {
			return filepath.SkipDir
		}
		if d.Type().IsRegular() {
			rel, err := filepath.Rel(root, p)
			if err != nil {
				return err
			}
			files = append(files, filepath.ToSlash(rel))
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return files
}

var topLevel = []string{"cmd", "app", "geo", "scoring", "assets", "sampledata", "testdata", "go.mod", "go.sum", "README.md", "DEVELOPERS.md", "LICENSE"}

func strange(files []string) []string {
	var out []string
	for _, f := range files {
		top, _, _ := strings.Cut(f, "/")
		if !strings.HasPrefix(top, ".") && !slices.Contains(topLevel, top) && !slices.Contains(out, top) {
			out = append(out, top)
		}
	}
	return out
}

func TestTopLevel(t *testing.T) {
	if got := strange(kept(t, repoRoot(t))); len(got) > 0 {
		t.Errorf("these do not belong at the top of the checkout: %q; it holds %q and dot-folders", got, topLevel)
	}
	if got := strange([]string{"geo/a.go", ".ci/run", "docs/a.md", "docs/b.md", "x.go"}); !slices.Equal(got, []string{"docs", "x.go"}) {
		t.Errorf("the test is blind: %q", got)
	}
}

// machinePaths finds absolute paths of one person's computer. The folder names are put
// together here so that this file does not hold what it looks for.
var machinePaths = func() *regexp.Regexp {
	folders := strings.Join([]string{"work", "root", "home", "Users"}, "|")
	return regexp.MustCompile(`(^|[^\w.~/:-])(/(` + folders + `)/|[A-Za-z]:\\Users\\)`)
}()

func TestNoMachinePaths(t *testing.T) {
	root := repoRoot(t)
	for _, f := range kept(t, root) {
		data, err := os.ReadFile(filepath.Join(root, filepath.FromSlash(f)))
		if err != nil {
			t.Fatal(err)
		}
		if bytes.IndexByte(data, 0) >= 0 || !utf8.Valid(data) {
			continue // not text
		}
		for i, l := range strings.Split(string(data), "\n") {
			if m := machinePaths.FindString(l); m != "" {
				t.Errorf("%s:%d: a path of one person's computer: %q", f, i+1, strings.TrimSpace(l))
			}
		}
	}
	slash := "/"
	for line, bad := range map[string]bool{
		"see " + slash + "home" + slash + "me/x": true, `"` + slash + "work" + slash + `x"`: true, slash + "root" + slash + ".cache": true,
		"=" + slash + "Users" + slash + "me": true, `C:` + `\Users\` + `me`: true,
		"https://example.org" + slash + "home" + slash: false, "net" + slash + "work" + slash + "x": false, "app/run" + slash + "home" + slash: false, slash + "usr/share/proj": false,
	} {
		if machinePaths.MatchString(line) != bad {
			t.Errorf("%q: found %v, want %v", line, !bad, bad)
		}
	}
}
