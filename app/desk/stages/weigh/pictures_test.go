package weigh

import (
	"image"
	"image/color"
	"math"
	"reflect"
	"testing"

	"groundtally/app/desk/core"
	"groundtally/app/desk/theme"
	"groundtally/app/study"
)

func TestPictures(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	ids := s.shown.Board.IDs
	o := s.shown.Standing.Order
	for _, size := range []struct {
		name          string
		width, height float32
	}{{"430", 430, 470}, {"520", 520, 480}, {"760", 760, 560}} {
		b.Show(s.Content(), size.width, size.height)
		b.Core.Choose(ids[o[0]], ids[o[9]])
		s.tabs.Choose(weightsTab)
		b.Shoot("weigh-weights-" + size.name)
		s.tabs.Choose(orderTab)
		list := s.panes[orderTab].(*order)
		b.Shoot("weigh-order-" + size.name)
		list.unfold(list.rows()[1])
		b.Shoot("weigh-order-open-" + size.name)
		list.unfold(list.rows()[1])
		list.picture(true)
		wait(b, list.bars)
		b.Shoot("weigh-order-picture-" + size.name)
		list.picture(false)
		s.tabs.Choose(pairTab)
		p := s.panes[pairTab].(*pairPane)
		wait(b, p.picture)
		p.all.ScrollToTop()
		b.Shoot("weigh-pair-" + size.name)
		p.all.ScrollToBottom()
		b.Shoot("weigh-pair-foot-" + size.name)
		s.tabs.Choose(voicesTab)
		b.Until("the voices are there", func() bool { return len(s.panes[voicesTab].(*voicesPane).columns) == 3 })
		b.Shoot("weigh-voices-" + size.name)
		s.tabs.Choose(scatterTab)
		wait(b, s.panes[scatterTab].(*scatterPane).picture)
		b.Shoot("weigh-scatter-" + size.name)
	}
	// A chart in the dark form is painted before the picture of it is taken.
	*b.Theme = *theme.New(theme.Dark)
	b.App.Settings().SetTheme(b.Theme)
	s.Changed(core.LookChanged)
	p := s.panes[scatterTab].(*scatterPane).picture
	wait(b, p)
	if at := p.img.At(1, 1); at != color.Color(color.RGBA{0x1a, 0x20, 0x1f, 0xff}) {
		t.Errorf("the ground of the chart is %v in the dark form", at)
	}
	*b.Theme = *theme.New(theme.Light)
	b.App.Settings().SetTheme(b.Theme)
	s.Changed(core.LookChanged)
	b.Show(s.Content(), 430, 470)
	s.tabs.Choose(weightsTab)
	b.Core.SetVoice("operator")
	settle(b, s)
	raw := b.Core.Raw()
	raw[0] = 33
	b.Core.Try(raw)
	b.Until("the order follows", func() bool { return b.Core.Ranking().Raw[0] == 33 })
	b.Shoot("weigh-weights-trying-430")
	s.back()
	b.Core.SetVoice("residents")
	settle(b, s)
	s.tabs.Choose(orderTab)
	b.Show(s.Content(), 520, 480)
	list := s.panes[orderTab].(*order)
	b.Window.Canvas().Focus(list.list)
	b.Shoot("weigh-order-residents-520")
	b.Show(s.Content(), 760, 560)
	list.unfold(list.rows()[2])
	b.Shoot("weigh-order-residents-760")
	b.Core.Set("limit", "test", study.SettingEdit{Key: "limit.ghg_g_per_kwh", Value: "40"})
	b.Until("the limit is seen", func() bool { return !b.Core.View().Current })
	settle(b, s)
	b.Shoot("weigh-order-over-760")
	b.Show(s.Content(), 430, 470)
	b.Shoot("weigh-order-over-430")
	b.Show(s.Content(), 760, 560)
	askKey(s)
	b.Shoot("weigh-ask-key")
	b.Window.Canvas().Overlays().Remove(b.Window.Canvas().Overlays().Top())
	askScale(s, "noise_dba")
	b.Shoot("weigh-ask-scale")
	b.Window.Canvas().Overlays().Remove(b.Window.Canvas().Overlays().Top())
	s.head.askNew()
	b.Shoot("weigh-ask-voice")
}

// A part that was not shown while the look changed has the new look when it is shown.
func TestLookReachesPartsThatWereNotShown(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	dark := func(mode theme.Mode) {
		*b.Theme = *theme.New(mode)
		b.App.Settings().SetTheme(b.Theme)
		b.Core.Emit(core.LookChanged)
	}
	capture := func(tab int) image.Image {
		s.tabs.Choose(tab)
		b.Pump()
		return b.Window.Canvas().Capture()
	}
	for _, tab := range []int{weightsTab, orderTab} {
		capture(tab)
		dark(theme.Dark)
		want := capture(tab)
		dark(theme.Light)
		light := capture(tab)
		s.tabs.Choose(voicesTab)
		dark(theme.Dark)
		got := capture(tab)
		if !reflect.DeepEqual(got, want) {
			t.Errorf("part %d has another look than one that was shown meanwhile", tab)
		}
		if reflect.DeepEqual(got, light) {
			t.Errorf("part %d looks the same in light and dark", tab)
		}
		dark(theme.Light)
	}
}

// TestPictureOfTheOrder holds the picture against the order: the same places, and parts that add up.
func TestPictureOfTheOrder(t *testing.T) {
	b, s := open(t, 60, 520, 480)
	s.tabs.Choose(orderTab)
	o := s.panes[orderTab].(*order)
	o.picture(true)
	wait(b, o.bars)
	in := scoresOf(b.Core, s.shown, o.rows())
	if len(in.Rows) != len(s.shown.Standing.Order) || len(in.Rows) < 3 {
		t.Fatalf("%d rows for %d places", len(in.Rows), len(s.shown.Standing.Order))
	}
	weights := 0.0
	for _, k := range in.Keys {
		weights += k.Weight
	}
	if math.Abs(weights-1) > 1e-12 {
		t.Errorf("weights add up to %v", weights)
	}
	for i, r := range in.Rows {
		item := s.shown.Standing.Order[i]
		sum := 0.0
		for _, p := range r.Parts {
			sum += p.Share
		}
		if r.Item != s.shown.Board.IDs[item] || math.Abs(sum-s.shown.Standing.Score[item]) > 1e-12 {
			t.Errorf("row %d is %s with parts of %v; the order has %s with %v", i, r.Item, sum, s.shown.Board.IDs[item], s.shown.Standing.Score[item])
		}
	}
	o.bars.pressed(in.Rows[1].Item, false)
	if got := b.Core.ChosenIDs(); len(got) != 1 || got[0] != in.Rows[1].Item {
		t.Errorf("a click on a bar chose %v", got)
	}
	b.Core.Choose()
}
