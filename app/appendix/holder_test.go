package appendix

import (
	"testing"

	"groundtally/app/study"
)

func TestHolderOfABackdrop(t *testing.T) {
	pic := study.LayerRecord{Role: study.BackdropRole, Holder: "Town", Match: map[string]string{"attribution": "© Survey 2031", "licence": "CC BY 4.0"}}
	if got := holder(pic); got != "Town; © Survey 2031; licence: CC BY 4.0" {
		t.Error(got)
	}
	pic.Holder, pic.Match = "", map[string]string{"attribution": "© Survey 2031"}
	if got := holder(pic); got != "© Survey 2031; licence not stated" {
		t.Error(got)
	}
	if got := holder(study.LayerRecord{Role: "roads", Holder: "Town"}); got != "Town" {
		t.Error(got)
	}
}
