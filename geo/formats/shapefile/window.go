package shapefile

import (
	"context"
	"errors"
	"io"

	"groundtally/geo/formats"
)

const (
	blockBytes    = 256 << 10
	progressEvery = 1 << 20
	doCopy        = "copy or export the whole set again"
)

// feed counts the bytes read of all files of a set.
type feed struct {
	ctx      context.Context
	progress func(int64)
	read     int64
	reported int64
}

// count is called with every block read, so that long reading can be watched and ended.
func (f *feed) count(n int) error {
	f.read += int64(n)
	if f.read-f.reported < progressEvery {
		return nil
	}
	f.reported = f.read
	if f.progress != nil {
		f.progress(f.read)
	}
	return f.ctx.Err()
}

// window reads a file at any place. It keeps the block it read last, so that small pieces one behind the
// other cost one read for many.
type window struct {
	feed *feed
	src  *Part
	base int64
	buf  []byte
	own  []byte // for pieces larger than a block
}

// at gives n bytes from an offset, valid until the next call. The caller has made sure that the piece lies
// within the file's size.
func (w *window) at(off int64, n int) ([]byte, error) {
	if off >= w.base && off+int64(n) <= w.base+int64(len(w.buf)) {
		return w.buf[off-w.base:][:n], nil
	}
	if n <= blockBytes {
		if w.buf == nil {
			w.buf = make([]byte, 0, min(blockBytes, max(w.src.Size, 0)))
		}
		w.base, w.buf = off, w.buf[:min(int64(cap(w.buf)), w.src.Size-off)]
		if err := w.fill(w.buf, off); err != nil {
			w.buf = w.buf[:0]
			return nil, err
		}
		return w.buf[:n], nil
	}
	// The length stands in the file; memory only grows as bytes are really there.
	w.own = w.own[:0]
	for len(w.own) < n {
		have := len(w.own)
		piece := min(n-have, max(blockBytes, have))
		w.own = append(w.own, make([]byte, piece)...)
		if err := w.fill(w.own[have:], off+int64(have)); err != nil {
			return nil, err
		}
	}
	return w.own, nil
}

func (w *window) fill(b []byte, off int64) error {
	n, err := w.src.ReadAt(b, off)
	if n < len(b) {
		if err == nil || errors.Is(err, io.EOF) {
			return &formats.Error{Code: "truncated", What: "the file became shorter while it was read", Do: doCopy}
		}
		if errors.Is(err, context.Canceled) || errors.Is(err, context.DeadlineExceeded) {
			return err
		}
		return &formats.Error{Code: "unreadable", What: "the file cannot be read on", Do: "check the disk or the connection to it", Err: err}
	}
	return w.feed.count(n)
}
