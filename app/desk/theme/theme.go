package theme

import (
	"image/color"
	"strconv"

	"fyne.io/fyne/v2"
	toolkit "fyne.io/fyne/v2/theme"

	"groundtally/app/draw"
	"groundtally/assets/fonts"
)

// Mode says which form the window has.
type Mode string

// The modes.
const (
	Light  Mode = "light"
	Dark   Mode = "dark"
	System Mode = "system" // as the desktop has it
)

// Theme is the look of the window.
type Theme struct {
	mode Mode
}

// New gives the theme in a mode; any other word than light or dark follows the desktop.
func New(m Mode) *Theme { return &Theme{mode: m} }

var (
	regular = fyne.NewStaticResource("Lato-Regular.ttf", fonts.Regular())
	bold    = fyne.NewStaticResource("Lato-Bold.ttf", fonts.Bold())
)

// Font implements fyne.Theme: one typeface, in two weights.
func (t *Theme) Font(s fyne.TextStyle) fyne.Resource {
	switch {
	case s.Symbol:
		return toolkit.DefaultTheme().Font(s)
	case s.Bold:
		return bold
	}
	return regular
}

// Icon implements fyne.Theme.
func (t *Theme) Icon(n fyne.ThemeIconName) fyne.Resource { return toolkit.DefaultTheme().Icon(n) }

// Size implements fyne.Theme.
func (t *Theme) Size(n fyne.ThemeSizeName) float32 {
	switch n {
	case toolkit.SizeNameText:
		return 13
	case toolkit.SizeNameCaptionText:
		return 11
	case toolkit.SizeNameHeadingText:
		return 18
	case toolkit.SizeNameSubHeadingText:
		return 14
	case toolkit.SizeNamePadding:
		return 4
	case toolkit.SizeNameInnerPadding:
		return 6
	case toolkit.SizeNameInlineIcon:
		return 16
	case toolkit.SizeNameScrollBar:
		return 10
	case toolkit.SizeNameScrollBarSmall:
		return 4
	case toolkit.SizeNameInputRadius, toolkit.SizeNameSelectionRadius:
		return 4
	}
	return toolkit.DefaultTheme().Size(n)
}

// Dark reports whether the dark form is shown where the desktop has the given variant.
func (t *Theme) Dark(desktop fyne.ThemeVariant) bool {
	switch t.mode {
	case Light:
		return false
	case Dark:
		return true
	}
	return desktop == toolkit.VariantDark
}

// Palette gives the colours of pictures under the variant of the desktop.
func (t *Theme) Palette(desktop fyne.ThemeVariant) draw.Palette {
	if t.Dark(desktop) {
		return draw.Dark()
	}
	return draw.Light()
}

// Names of colours beyond the toolkit's.
const (
	Rail  fyne.ThemeColorName = "groundtallyRail"  // ground of the rail
	Faint fyne.ThemeColorName = "groundtallyFaint" // text of lesser weight
	Rule  fyne.ThemeColorName = "groundtallyRule"  // thin lines
	Warm  fyne.ThemeColorName = "groundtallyWarm"  // wants attention; always beside a word
	Track fyne.ThemeColorName = "groundtallyTrack" // ground of bars
	Tint  fyne.ThemeColorName = "groundtallyTint"  // a chosen row
)

// Color implements fyne.Theme.
func (t *Theme) Color(n fyne.ThemeColorName, desktop fyne.ThemeVariant) color.Color {
	dark := t.Dark(desktop)
	p := t.Palette(desktop)
	pick := func(light, night string) color.Color {
		if dark {
			return Colour(night)
		}
		return Colour(light)
	}
	switch n {
	case toolkit.ColorNameBackground, toolkit.ColorNameOverlayBackground, toolkit.ColorNameMenuBackground:
		return Colour(p.Paper)
	case toolkit.ColorNameForeground:
		return Colour(p.Ink)
	case Faint, toolkit.ColorNamePlaceHolder:
		return Colour(p.Faint)
	case Rule, toolkit.ColorNameSeparator:
		return Colour(p.Rule)
	case Warm, toolkit.ColorNameWarning, toolkit.ColorNameError:
		return Colour(p.Warm)
	case toolkit.ColorNamePrimary, toolkit.ColorNameHyperlink, toolkit.ColorNameSuccess:
		return Colour(p.Accent)
	case toolkit.ColorNameForegroundOnPrimary, toolkit.ColorNameForegroundOnError, toolkit.ColorNameForegroundOnWarning, toolkit.ColorNameForegroundOnSuccess:
		return Colour(draw.TextOn(p.Accent))
	case Rail, toolkit.ColorNameHeaderBackground:
		return pick("#efeade", "#141918")
	case Track, toolkit.ColorNameButton, toolkit.ColorNameDisabledButton:
		return pick("#ece7da", "#2b3331")
	case toolkit.ColorNameInputBackground:
		return pick("#ffffff", "#222a28")
	case toolkit.ColorNameInputBorder:
		return pick("#8f8a7c", "#6b7572")
	case Tint, toolkit.ColorNameSelection:
		return pick("#d7e6e2", "#24403d")
	case toolkit.ColorNameFocus:
		return pick("#0e5c5c66", "#62c4b977")
	case toolkit.ColorNameHover:
		return pick("#0e5c5c14", "#62c4b91f")
	case toolkit.ColorNamePressed:
		return pick("#0e5c5c2e", "#62c4b93a")
	case toolkit.ColorNameDisabled:
		return pick("#8b877b", "#77807d")
	case toolkit.ColorNameScrollBar:
		return pick("#8f8a7c", "#6b7572")
	case toolkit.ColorNameScrollBarBackground:
		return color.Transparent
	case toolkit.ColorNameShadow:
		return pick("#0000002e", "#00000066")
	}
	v := toolkit.VariantLight
	if dark {
		v = toolkit.VariantDark
	}
	return toolkit.DefaultTheme().Color(n, v)
}

// Colour reads "#rrggbb" or "#rrggbbaa".
func Colour(s string) color.NRGBA {
	part := func(i int) uint8 {
		if i+2 > len(s) {
			return 255
		}
		x, err := strconv.ParseUint(s[i:i+2], 16, 8)
		if err != nil {
			return 0
		}
		return uint8(x)
	}
	return color.NRGBA{R: part(1), G: part(3), B: part(5), A: part(7)}
}
