package store

import (
	"bytes"
	"context"
	"database/sql"
	"database/sql/driver"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net/url"
	"os"
	"path/filepath"
	"sort"
	"strings"
	"time"

	_ "modernc.org/sqlite" // the SQLite driver

	"groundtally/app/study"
)

// busyTimeout is how long a call waits for another program before it gives study.ErrBusy.
const busyTimeout = 5 * time.Second

// timeForm is RFC 3339 with a fixed number of digits, so that text order is time order.
const timeForm = "2006-01-02T15:04:05.000000000Z"

type options struct {
	busy       time.Duration
	migrations []func(context.Context, *sql.Conn) error
	pragmas    []string
}

func usual() options { return options{busy: busyTimeout, migrations: migrations} }

// file is an open study file. The pool holds one connection, so that calls from several goroutines
// follow one another.
type file struct {
	path string
	db   *sql.DB
	fail func() error // asked before every statement that writes; nil outside tests
}

var _ study.Store = (*file)(nil)

// Create makes an empty study at path. It refuses to overwrite: where something is there already the
// error is study.ErrNameInUse.
func Create(ctx context.Context, path string) (study.Store, error) {
	f, err := create(ctx, path, usual())
	if err != nil {
		return nil, wrap(path, "create study", err)
	}
	return f, nil
}

func create(ctx context.Context, path string, o options) (*file, error) {
	h, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_RDWR, 0o666)
	if err != nil {
		return nil, err
	}
	if err := h.Close(); err != nil {
		return nil, err
	}
	f, err := connect(ctx, path, o)
	if err == nil {
		if err = f.migrate(ctx, 0, o.migrations); err == nil {
			return f, nil
		}
		err = errors.Join(err, f.db.Close())
	}
	// The file was made above, so taking it away destroys nothing of the user's.
	return nil, errors.Join(err, os.Remove(path))
}

// Open opens the study at path. A file that is there but not a study gives study.ErrNotAStudy, one of
// a later schema study.ErrNewerStudy; one of an earlier schema is brought up to date.
func Open(ctx context.Context, path string) (study.Store, error) {
	f, err := open(ctx, path, usual())
	if err != nil {
		return nil, wrap(path, "open study", err)
	}
	return f, nil
}

func open(ctx context.Context, path string, o options) (*file, error) {
	if err := sniff(path); err != nil {
		return nil, err
	}
	f, err := connect(ctx, path, o)
	if err != nil {
		return nil, err
	}
	if err := f.prepare(ctx, o); err != nil {
		return nil, errors.Join(err, f.db.Close())
	}
	return f, nil
}

// sniff tells what can be told from the first bytes, in plain words.
func sniff(path string) error {
	h, err := os.Open(path)
	if err != nil {
		if errors.Is(err, os.ErrPermission) {
			return fmt.Errorf("you have no right to read the file: %w", err)
		}
		return err
	}
	defer h.Close()
	info, err := h.Stat()
	if err != nil {
		return err
	}
	if info.IsDir() {
		return fmt.Errorf("%w: it is a folder", study.ErrNotAStudy)
	}
	head := make([]byte, 16)
	switch n, err := io.ReadFull(h, head); {
	case n == 0 && errors.Is(err, io.EOF):
		return fmt.Errorf("%w: the file is empty", study.ErrNotAStudy)
	case err != nil && !errors.Is(err, io.ErrUnexpectedEOF):
		return err
	case string(head[:n]) != "SQLite format 3\x00":
		return fmt.Errorf("%w: it is not a GeoPackage", study.ErrNotAStudy)
	}
	return nil
}

func connect(ctx context.Context, path string, o options) (*file, error) {
	abs, err := filepath.Abs(path)
	if err != nil {
		return nil, err
	}
	p := filepath.ToSlash(abs)
	if !strings.HasPrefix(p, "/") {
		p = "/" + p // a drive letter
	}
	q := url.Values{"mode": {"rw"}, "_defensive": {"1"}}
	pragmas := append([]string{
		fmt.Sprintf("busy_timeout(%d)", o.busy.Milliseconds()),
		"foreign_keys(1)",
		"synchronous(FULL)",
		"trusted_schema(0)",
		"cell_size_check(1)",
	}, o.pragmas...)
	for _, v := range pragmas {
		q.Add("_pragma", v)
	}
	u := url.URL{Scheme: "file", Path: p, RawQuery: q.Encode()}
	db, err := sql.Open("sqlite", u.String())
	if err != nil {
		return nil, err
	}
	db.SetMaxOpenConns(1)
	f := &file{path: path, db: db}
	if err := db.PingContext(ctx); err != nil {
		return nil, errors.Join(err, db.Close())
	}
	return f, nil
}

func (f *file) prepare(ctx context.Context, o options) error {
	version, err := f.version(ctx)
	if err != nil {
		return err
	}
	if version > len(o.migrations) {
		return fmt.Errorf("%w: it has schema %d, this program knows up to %d", study.ErrNewerStudy, version, len(o.migrations))
	}
	if version < len(o.migrations) {
		return f.migrate(ctx, version, o.migrations)
	}
	return f.rollbackJournal(ctx)
}

func (f *file) version(ctx context.Context) (int, error) {
	var n int
	if err := f.db.QueryRowContext(ctx, `SELECT count(*) FROM sqlite_master WHERE type = 'table' AND name = 'gt_schema'`).Scan(&n); err != nil {
		return 0, err
	}
	if n == 0 {
		return 0, fmt.Errorf("%w: it is a database without the tables of a study; add it to a study as a layer instead", study.ErrNotAStudy)
	}
	var version int
	err := f.db.QueryRowContext(ctx, `SELECT version FROM gt_schema WHERE id = 1`).Scan(&version)
	if errors.Is(err, sql.ErrNoRows) {
		return 0, fmt.Errorf("%w: its schema number is gone", study.ErrDamaged)
	}
	return version, err
}

// rollbackJournal turns write-ahead logging off, which other programs switch on and sometimes leave
// on: with it a study is more than one file and does not lie safely on a network folder.
func (f *file) rollbackJournal(ctx context.Context) error {
	var mode string
	if err := f.db.QueryRowContext(ctx, `PRAGMA journal_mode`).Scan(&mode); err != nil {
		return err
	}
	if mode == "delete" {
		return nil
	}
	err := f.db.QueryRowContext(ctx, `PRAGMA journal_mode = DELETE`).Scan(&mode)
	if primaryCode(err) == codeReadOnly {
		return nil // it can be read all the same
	}
	return err
}

func (f *file) migrate(ctx context.Context, from int, steps []func(context.Context, *sql.Conn) error) error {
	if err := f.rollbackJournal(ctx); err != nil {
		return err
	}
	return f.write(ctx, func(c *sql.Conn) error {
		if from > 0 { // another program may have done it meanwhile
			if err := c.QueryRowContext(ctx, `SELECT version FROM gt_schema WHERE id = 1`).Scan(&from); err != nil {
				return err
			}
		}
		for n := from; n < len(steps); n++ {
			if err := steps[n](ctx, c); err != nil {
				return fmt.Errorf("bring to schema %d: %w", n+1, err)
			}
		}
		return f.exec(ctx, c, `UPDATE gt_schema SET version = ? WHERE id = 1`, len(steps))
	})
}

// write runs fn in one transaction that holds the write lock from the start.
func (f *file) write(ctx context.Context, fn func(*sql.Conn) error) error {
	return f.transaction(ctx, "BEGIN IMMEDIATE", fn)
}

// read runs fn in one transaction, so that all it reads is of one moment.
func (f *file) read(ctx context.Context, fn func(*sql.Conn) error) error {
	return f.transaction(ctx, "BEGIN", fn)
}

func (f *file) transaction(ctx context.Context, begin string, fn func(*sql.Conn) error) (err error) {
	c, err := f.db.Conn(ctx)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, c.Close()) }()
	// A cancelled context must not leave the transaction open, nor leave it unknown whether it was
	// committed. It may also end the call that begins one after the transaction has begun.
	always := context.WithoutCancel(ctx)
	done := false
	defer func() {
		if done {
			return
		}
		// SQLite may have rolled back by itself; then there is nothing to roll back, which is no
		// fault. A connection that stays inside a transaction is thrown away.
		if _, back := c.ExecContext(always, "ROLLBACK"); back != nil && !strings.Contains(back.Error(), "no transaction is active") {
			// What Raw reports is the very error given to it.
			_ = c.Raw(func(any) error { return driver.ErrBadConn })
		}
	}()
	if _, err := c.ExecContext(ctx, begin); err != nil {
		return err
	}
	if err := fn(c); err != nil {
		return err
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	if err := f.mayFail(); err != nil {
		return err
	}
	if _, err := c.ExecContext(always, "COMMIT"); err != nil {
		return err
	}
	done = true
	return nil
}

func (f *file) mayFail() error {
	if f.fail == nil {
		return nil
	}
	return f.fail()
}

func (f *file) exec(ctx context.Context, c *sql.Conn, query string, args ...any) error {
	if err := f.mayFail(); err != nil {
		return err
	}
	_, err := c.ExecContext(ctx, query, args...)
	return err
}

// Path gives the path as it was given.
func (f *file) Path() string { return f.path }

// Close closes the file.
func (f *file) Close() error { return wrap(f.path, "close study", f.db.Close()) }

// Load reads records, journal and frozen states, all of one moment.
func (f *file) Load(ctx context.Context) (study.State, error) {
	var st study.State
	err := f.read(ctx, func(c *sql.Conn) error {
		st = study.State{}
		if err := each(ctx, c, `SELECT kind, key, value FROM gt_record ORDER BY kind, key`, func(r *sql.Rows) error {
			rec, err := scanRecord(r)
			st.Records = append(st.Records, rec)
			return err
		}); err != nil {
			return err
		}
		if err := loadJournal(ctx, c, &st); err != nil {
			return err
		}
		return loadFrozen(ctx, c, &st)
	})
	if err != nil {
		return study.State{}, wrap(f.path, "read study", err)
	}
	return st, nil
}

// each runs the query and calls fn for every row.
func each(ctx context.Context, c *sql.Conn, query string, fn func(*sql.Rows) error, args ...any) (err error) {
	rows, err := c.QueryContext(ctx, query, args...)
	if err != nil {
		return err
	}
	defer func() { err = errors.Join(err, rows.Close()) }()
	for rows.Next() {
		if err := fn(rows); err != nil {
			return err
		}
	}
	return rows.Err()
}

func scanRecord(r *sql.Rows) (study.Record, error) {
	var kind, key string
	var value []byte
	err := r.Scan(&kind, &key, &value)
	return study.Record{Kind: study.RecordKind(kind), Key: key, Value: value}, err
}

func loadJournal(ctx context.Context, c *sql.Conn, st *study.State) error {
	at := map[int64]int{}
	if err := each(ctx, c, `SELECT seq, at, who, verb, reason, of FROM gt_journal ORDER BY seq`, func(r *sql.Rows) error {
		var e study.Entry
		var when string
		if err := r.Scan(&e.Seq, &when, &e.Who, &e.Verb, &e.Reason, &e.Of); err != nil {
			return err
		}
		var err error
		if e.At, err = readTime(when); err != nil {
			return fmt.Errorf("journal entry %d: %w", e.Seq, err)
		}
		at[e.Seq] = len(st.Journal)
		st.Journal = append(st.Journal, e)
		return nil
	}); err != nil {
		return err
	}
	return each(ctx, c, `SELECT seq, kind, key, old, new FROM gt_change ORDER BY seq, pos`, func(r *sql.Rows) error {
		var seq int64
		var kind, key string
		var before, after []byte
		if err := r.Scan(&seq, &kind, &key, &before, &after); err != nil {
			return err
		}
		i, ok := at[seq]
		if !ok {
			return fmt.Errorf("%w: a change names journal entry %d, which is not there", study.ErrDamaged, seq)
		}
		st.Journal[i].Changes = append(st.Journal[i].Changes, study.Change{Kind: study.RecordKind(kind), Key: key, Old: before, New: after})
		return nil
	})
}

func loadFrozen(ctx context.Context, c *sql.Conn, st *study.State) error {
	at := map[string]int{}
	if err := each(ctx, c, `SELECT name, at, seq, code FROM gt_frozen ORDER BY at, name`, func(r *sql.Rows) error {
		var z study.Frozen
		var when string
		if err := r.Scan(&z.Name, &when, &z.Seq, &z.Code); err != nil {
			return err
		}
		var err error
		if z.At, err = readTime(when); err != nil {
			return fmt.Errorf("frozen state %q: %w", z.Name, err)
		}
		at[z.Name] = len(st.Frozen)
		st.Frozen = append(st.Frozen, z)
		return nil
	}); err != nil {
		return err
	}
	return each(ctx, c, `SELECT name, kind, key, value FROM gt_frozen_record ORDER BY name, pos`, func(r *sql.Rows) error {
		var name, kind, key string
		var value []byte
		if err := r.Scan(&name, &kind, &key, &value); err != nil {
			return err
		}
		i, ok := at[name]
		if !ok {
			return fmt.Errorf("%w: a record names frozen state %q, which is not there", study.ErrDamaged, name)
		}
		st.Frozen[i].Records = append(st.Frozen[i].Records, study.Record{Kind: study.RecordKind(kind), Key: key, Value: value})
		return nil
	})
}

func readTime(s string) (time.Time, error) {
	t, err := time.Parse(timeForm, s)
	if err != nil {
		return t, fmt.Errorf("%w: %q is not a time", study.ErrDamaged, s)
	}
	return t, nil
}

func writeTime(t time.Time) (string, error) {
	t = t.UTC()
	if y := t.Year(); y < 0 || y > 9999 {
		return "", fmt.Errorf("year %d cannot be stored", y)
	}
	return t.Format(timeForm), nil
}

// Commit appends the entry, adds the versions and applies the changes in one transaction. The old
// value of every change must be what the file holds; where it is not, another program changed the
// record, and the error is study.ErrBusy.
func (f *file) Commit(ctx context.Context, e study.Entry, add []study.Version) (study.Entry, error) {
	err := f.write(ctx, func(c *sql.Conn) error {
		if err := c.QueryRowContext(ctx, `SELECT coalesce(max(seq), 0) + 1 FROM gt_journal`).Scan(&e.Seq); err != nil {
			return err
		}
		at, err := writeTime(e.At)
		if err != nil {
			return err
		}
		for _, v := range add {
			if err := f.putVersion(ctx, c, v, e.At); err != nil {
				return err
			}
		}
		if err := f.exec(ctx, c, `INSERT INTO gt_journal (seq, at, who, verb, reason, of) VALUES (?, ?, ?, ?, ?, ?)`,
			e.Seq, at, e.Who, e.Verb, e.Reason, e.Of); err != nil {
			return err
		}
		return f.apply(ctx, c, e)
	})
	if err != nil {
		return study.Entry{}, wrap(f.path, "write study", err)
	}
	return e, nil
}

type recordKey struct {
	kind study.RecordKind
	key  string
}

func (f *file) apply(ctx context.Context, c *sql.Conn, e study.Entry) error {
	first := map[recordKey][]byte{} // the values before the entry, for records that it changes twice
	for i, ch := range e.Changes {
		var now []byte
		err := c.QueryRowContext(ctx, `SELECT value FROM gt_record WHERE kind = ? AND key = ?`, string(ch.Kind), ch.Key).Scan(&now)
		if err != nil && !errors.Is(err, sql.ErrNoRows) {
			return err
		}
		k := recordKey{ch.Kind, ch.Key}
		before, again := first[k]
		if !again {
			first[k] = now
		}
		if !sameJSON(ch.Old, now) && !(again && sameJSON(ch.Old, before)) {
			return fmt.Errorf("%w: %s %q was changed meanwhile; open the study again", study.ErrBusy, ch.Kind, ch.Key)
		}
		if ch.New != nil && !json.Valid(ch.New) {
			return fmt.Errorf("new value of %s %q is not JSON", ch.Kind, ch.Key)
		}
		if err := f.exec(ctx, c, `INSERT INTO gt_change (seq, pos, kind, key, old, new) VALUES (?, ?, ?, ?, ?, ?)`,
			e.Seq, i, string(ch.Kind), ch.Key, nullable(ch.Old), nullable(ch.New)); err != nil {
			return err
		}
		if ch.New == nil {
			err = f.exec(ctx, c, `DELETE FROM gt_record WHERE kind = ? AND key = ?`, string(ch.Kind), ch.Key)
		} else {
			err = f.exec(ctx, c, `INSERT INTO gt_record (kind, key, value) VALUES (?, ?, ?)
				ON CONFLICT (kind, key) DO UPDATE SET value = excluded.value`, string(ch.Kind), ch.Key, string(ch.New))
		}
		if err != nil {
			return err
		}
	}
	return nil
}

func nullable(b []byte) any {
	if b == nil {
		return nil
	}
	return string(b)
}

// sameJSON compares two values without regard to white space; nil is only equal to nil.
func sameJSON(a, b []byte) bool {
	if bytes.Equal(a, b) {
		return (a == nil) == (b == nil)
	}
	if a == nil || b == nil {
		return false
	}
	var x, y bytes.Buffer
	return json.Compact(&x, a) == nil && json.Compact(&y, b) == nil && bytes.Equal(x.Bytes(), y.Bytes())
}

// Freeze adds a frozen state.
func (f *file) Freeze(ctx context.Context, z study.Frozen) error {
	err := f.write(ctx, func(c *sql.Conn) error {
		var n int
		if err := c.QueryRowContext(ctx, `SELECT count(*) FROM gt_frozen WHERE name = ?`, z.Name).Scan(&n); err != nil {
			return err
		}
		if n > 0 {
			return fmt.Errorf("frozen state %q: %w", z.Name, study.ErrNameInUse)
		}
		at, err := writeTime(z.At)
		if err != nil {
			return err
		}
		if err := f.exec(ctx, c, `INSERT INTO gt_frozen (name, at, seq, code) VALUES (?, ?, ?, ?)`, z.Name, at, z.Seq, z.Code); err != nil {
			return err
		}
		for i, r := range z.Records {
			if !json.Valid(r.Value) {
				return fmt.Errorf("value of %s %q is not JSON", r.Kind, r.Key)
			}
			if err := f.exec(ctx, c, `INSERT INTO gt_frozen_record (name, pos, kind, key, value) VALUES (?, ?, ?, ?, ?)`,
				z.Name, i, string(r.Kind), r.Key, string(r.Value)); err != nil {
				return err
			}
		}
		return nil
	})
	return wrap(f.path, "write study", err)
}

// PutResults adds results. Where keep is not nil, every step that is named in it or that a new result
// belongs to loses the results whose digests keep does not name.
func (f *file) PutResults(ctx context.Context, add []study.Result, keep map[string]map[string]bool) error {
	if len(add) == 0 && len(keep) == 0 {
		return nil
	}
	err := f.write(ctx, func(c *sql.Conn) error {
		touched := map[string]bool{}
		for _, r := range add {
			touched[r.Step] = true
			data := r.Data
			if data == nil {
				data = []byte{}
			}
			if err := f.exec(ctx, c, `INSERT INTO gt_result (step, digest, data) VALUES (?, ?, ?)
				ON CONFLICT (step, digest) DO UPDATE SET data = excluded.data`, r.Step, r.Digest, data); err != nil {
				return err
			}
		}
		if keep == nil {
			return nil
		}
		for step := range keep {
			touched[step] = true
		}
		steps := make([]string, 0, len(touched))
		for step := range touched {
			steps = append(steps, step)
		}
		sort.Strings(steps)
		for _, step := range steps {
			wanted := make([]string, 0, len(keep[step]))
			for digest, yes := range keep[step] {
				if yes {
					wanted = append(wanted, digest)
				}
			}
			sort.Strings(wanted)
			list, err := json.Marshal(wanted)
			if err != nil {
				return err
			}
			if err := f.exec(ctx, c, `DELETE FROM gt_result WHERE step = ? AND digest NOT IN (SELECT value FROM json_each(?))`, step, string(list)); err != nil {
				return err
			}
		}
		return nil
	})
	return wrap(f.path, "write results", err)
}

// Results gives the data of those wanted digests of a step that are there.
func (f *file) Results(ctx context.Context, step string, digests []string) (map[string][]byte, error) {
	out := make(map[string][]byte, len(digests))
	list, err := json.Marshal(append([]string{}, digests...))
	if err != nil {
		return nil, err
	}
	err = f.read(ctx, func(c *sql.Conn) error {
		return each(ctx, c, `SELECT digest, data FROM gt_result WHERE step = ? AND digest IN (SELECT value FROM json_each(?))`,
			func(r *sql.Rows) error {
				var digest string
				var data []byte
				err := r.Scan(&digest, &data)
				out[digest] = data
				return err
			}, step, string(list))
	})
	if err != nil {
		return nil, wrap(f.path, "read results", err)
	}
	return out, nil
}

// Check runs SQLite's integrity check and looks for broken references.
func (f *file) Check(ctx context.Context) error {
	err := f.read(ctx, func(c *sql.Conn) error {
		var found []string
		if err := each(ctx, c, `PRAGMA integrity_check(10)`, func(r *sql.Rows) error {
			var line string
			err := r.Scan(&line)
			if line != "ok" {
				found = append(found, line)
			}
			return err
		}); err != nil {
			return err
		}
		if err := each(ctx, c, `SELECT DISTINCT "table" FROM pragma_foreign_key_check`, func(r *sql.Rows) error {
			var table string
			err := r.Scan(&table)
			found = append(found, "broken reference in "+table)
			return err
		}); err != nil {
			return err
		}
		if len(found) > 0 {
			return fmt.Errorf("%w: %s", study.ErrDamaged, strings.Join(found, "; "))
		}
		return nil
	})
	return wrap(f.path, "check study", err)
}
