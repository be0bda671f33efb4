package accounts

import (
	"strings"
	"testing"

	"fyne.io/fyne/v2"

	"groundtally/app/desk/core"
	"groundtally/app/desk/desktest"
	"groundtally/app/desk/theme"
	"groundtally/app/methods"
	"groundtally/app/study"
)

// The methods tell every dispute of an account with what the study has set, the formulas with their sources, and are
// made when they are first shown.
func TestMethodsAreTold(t *testing.T) {
	b, s := open(t, 20, 620, 900)
	if s.methods != nil {
		t.Error("made before it is shown")
	}
	s.tabs.Choose(4)
	m := s.methods
	if m == nil || len(m.pages) != 1 {
		t.Fatal("it is not made, or more than the first page is")
	}
	text := func(i int) string {
		var out []string
		for _, b := range m.pages[i].prose.blocks {
			out = append(out, b.text)
		}
		return strings.Join(out, "\n")
	}
	list, err := methods.Shipped()
	if err != nil {
		t.Fatal(err)
	}
	for i, a := range methods.Accounts {
		m.tabs.Choose(i)
		got := text(i)
		for _, d := range list {
			if (d.Account == a) != strings.Contains(got, d.Disputed) {
				t.Errorf("%s: %q is missing, or stands where it does not belong", a, d.Topic)
			}
		}
		for _, want := range []string{"What is disputed", "Here: ", "Source: ", "Formulas in force"} {
			if !strings.Contains(got, want) {
				t.Errorf("%s says nowhere %q", a, want)
			}
		}
		b.Shoot("accounts-methods-" + string(a) + "-620")
	}
	for page, wants := range [][]string{
		{"energy.primary_equivalent off; grid_efficiency 0.35 (0.3 to 0.45)", "E_del: Electricity of the life at the grid: (1 − λ)·E_gen", "'Energy return with stocks' counts it", "Measured on the layers"},
		{"Soil under panels", "Total ground of plant, ha", "Peat touched"},
		{"Follows by arithmetic.", "In this study: climate.displacement_share 1;"},
	} {
		for _, want := range wants {
			if !strings.Contains(text(page), want) {
				t.Errorf("page %d says nowhere %q", page, want)
			}
		}
	}
	// Lines are no wider than the page, none is lost, and the page is as high as its lines.
	p := m.pages[2].prose
	words := 0
	for _, l := range p.lines {
		words += len(strings.Fields(l.text))
	}
	want := 0
	for _, b := range p.blocks {
		want += len(strings.Fields(b.text))
	}
	if words != want || p.MinSize().Height != p.height || p.height < 900 || p.lines[len(p.lines)-1].y > p.height {
		t.Errorf("%d words of %d on a page of %v", words, want, p.height)
	}
	was := p.height
	b.Window.Resize(fyne.NewSize(1000, 900))
	if p.height >= was {
		t.Errorf("a wider page is %v high, a narrower one %v", p.height, was)
	}
	b.Window.Resize(fyne.NewSize(620, 900))

	// What the study sets is told anew, without another visit.
	b.Core.Set("half", "test", study.SettingEdit{Key: "climate.displacement_share", Value: "0.5"})
	settled(b, s)
	if !strings.Contains(text(2), "In this study: climate.displacement_share 0.5;") {
		t.Error("it tells of an older state of the study")
	}

	*b.Theme = *theme.New(theme.Dark)
	b.App.Settings().SetTheme(b.Theme)
	b.Core.Emit(core.LookChanged)
	m.tabs.Choose(0)
	desktest.Save(t, "accounts-methods-620-dark.png", b.Window.Canvas().Capture())
}

func BenchmarkMethodsFirstShown(b *testing.B) {
	bench, s := open(b, 20, 620, 900)
	b.ResetTimer()
	for range b.N {
		m := newMethodsPane(bench.Core)
		m.body.Resize(fyne.NewSize(600, 800))
	}
	_ = s
}
