package study

import (
	"context"
	"encoding/json"
	"errors"
	"time"

	"groundtally/geo"
)

// RecordKind groups the records of a study.
type RecordKind string

// The kinds of record. Meta: name, frame centre, seed. Setting: one setting by its key. Layer: one
// LayerRecord by the layer's name. Group: one site made of several parcels. TurbineRecord and LayoutRecord stand with what they hold.
const (
	MetaRecord    RecordKind = "meta"
	SettingRecord RecordKind = "setting"
	LayerRecKind  RecordKind = "layer"
	GroupRecord   RecordKind = "group"
)

// Record is one named piece of a study's state, its value in canonical JSON.
type Record struct {
	Kind  RecordKind      `json:"kind"`
	Key   string          `json:"key"`
	Value json.RawMessage `json:"value"`
}

// Change is what an edit did to one record. A nil Old means that it was not there before, a nil New
// that the edit took it out.
type Change struct {
	Kind RecordKind      `json:"kind"`
	Key  string          `json:"key"`
	Old  json.RawMessage `json:"old,omitempty"`
	New  json.RawMessage `json:"new,omitempty"`
}

// Entry is one line of the journal. The journal is append-only: undo and redo are entries that name
// the entry they take back or bring back, so nothing that was ever done is lost.
type Entry struct {
	Seq     int64     `json:"seq"`
	At      time.Time `json:"at"` // UTC
	Who     string    `json:"who,omitempty"`
	Verb    string    `json:"verb"` // "add", "set", "undo", …
	Reason  string    `json:"reason,omitempty"`
	Of      int64     `json:"of,omitempty"` // for undo and redo: the entry concerned
	Changes []Change  `json:"changes"`
}

// Frozen is a named moment of a study that cannot be changed any more.
type Frozen struct {
	Name    string    `json:"name"`
	At      time.Time `json:"at"`
	Seq     int64     `json:"seq"`  // last journal entry that is in it
	Code    string    `json:"code"` // check code of the state, empty when it was not computed
	Records []Record  `json:"records"`
}

// State is everything of a study but the contents of its layers and its results.
type State struct {
	Records []Record // by kind, then key
	Journal []Entry  // by sequence
	Frozen  []Frozen // by time, then name
}

// Version is one immutable content of a layer or of a raster, named by its digest.
type Version struct {
	Digest string // SHA-256, hexadecimal, as given by LayerDigest or BlobDigest
	Layer  *geo.Layer
	Blob   []byte // for a raster or another file kept whole; Layer is nil then
	Media  string // what Blob is, "text/x-ascii-grid" for one
}

// Result is one stored step result. Results can always be made again; they are a cache.
type Result struct {
	Step   string
	Digest string // of everything the step read
	Data   []byte
}

// Errors that a Store returns, wrapped with the file's name.
var (
	ErrNotAStudy   = errors.New("not a study file")
	ErrNewerStudy  = errors.New("study was written by a newer version of the program")
	ErrNotThere    = errors.New("not there")
	ErrReadOnly    = errors.New("file or folder cannot be written")
	ErrDiskFull    = errors.New("disk is full")
	ErrBusy        = errors.New("study is being changed by another program")
	ErrDamaged     = errors.New("study file is damaged")
	ErrNameInUse   = errors.New("name is in use")
	ErrNothingToDo = errors.New("nothing to undo or redo")
)

// Store keeps a study in one file. Every method that writes is one transaction: it happens whole or
// not at all, and survives a kill at any moment.
type Store interface {
	Path() string
	// Load reads records, journal and frozen states.
	Load(ctx context.Context) (State, error)
	// Commit appends the entry, whose Seq it assigns, adds the versions and applies the changes.
	Commit(ctx context.Context, e Entry, add []Version) (Entry, error)
	// Version reads the content with the digest; changed is true when the content no longer has
	// that digest, which means that another program changed it.
	Version(ctx context.Context, digest string) (v Version, changed bool, err error)
	// Freeze adds a frozen state; ErrNameInUse when there is one of that name.
	Freeze(ctx context.Context, f Frozen) error
	// PutResults adds step results and drops those of the same step whose digests are not in keep
	// (nil keeps all).
	PutResults(ctx context.Context, add []Result, keep map[string]map[string]bool) error
	// Results gives the data of the wanted digests of a step that are there.
	Results(ctx context.Context, step string, digests []string) (map[string][]byte, error)
	// Check runs the file's own integrity check.
	Check(ctx context.Context) error
	Close() error
}
