package study

import (
	"fmt"
	"regexp"
	"strings"

	"groundtally/geo"
)

// HourlyRole is the role of a table of hours.
const HourlyRole = "hourly_weather"

// The settings that say how the times of a table of hours are meant.
const (
	StampKey  = "weather.stamp"
	OffsetKey = "weather.utc_offset_h"
)

// saysZone finds the zone at the end of a time.
var saysZone = regexp.MustCompile(`(Z|[+-]\d\d:\d\d)$`)

// ZoneSaid reports whether the times of a table of hours say their zone.
func ZoneSaid(l *geo.Layer, column string) bool {
	at := l.ColumnIndex(column)
	for _, f := range l.Features {
		if at >= 0 && f.Values[at].Kind != geo.Null {
			return saysZone.MatchString(strings.TrimSpace(f.Values[at].String()))
		}
	}
	return false
}

// hours gives the changes of settings that come with a table of hours: what its times mark, and how far its clock is
// ahead of UTC. What the study knows already is not asked for again; what is said anew holds.
func (s *Study) hours(in Import, rec LayerRecord, snap *Snapshot) (changes []Change, qs []Question, err error) {
	said := func(key, value string) error {
		def, ok := s.cat.Definition(key)
		if !ok {
			return &UnknownKeyError{Key: key}
		}
		v, err := def.CheckValue(value)
		if err != nil {
			return &ValueError{Key: key, Err: err}
		}
		changes = append(changes, Change{Kind: SettingRecord, Key: key, New: Canonical(Setting{Value: v, Unit: def.Unit, Source: in.Base, Reason: in.Reason})})
		return nil
	}
	_, stamped := snap.Explicit[StampKey]
	_, offset := snap.Explicit[OffsetKey]
	switch {
	case in.Stamp != "":
		err = said(StampKey, in.Stamp)
	case !stamped:
		qs = append(qs, Question{Text: fmt.Sprintf("what do the times in column %q mark: the start, the centre or the end of the interval?", rec.Match["time"]), Option: "--stamp start, --stamp centre or --stamp end"})
	}
	switch {
	case err != nil:
	case in.OffsetH != "":
		err = said(OffsetKey, in.OffsetH)
	case !offset && !ZoneSaid(in.Layer, rec.Match["time"]):
		qs = append(qs, Question{Text: "the times say no zone: how many hours is their clock ahead of UTC, without daylight saving time?", Option: "--utc-offset HOURS, as 1 for Central European Time"})
	}
	return changes, qs, err
}
