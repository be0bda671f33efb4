package run

import (
	"bytes"
	"compress/flate"
	"context"
	"crypto/sha256"
	"encoding/json"
	"fmt"
	"io"
	"sync"

	"groundtally/app/study"
)

// Cache keeps step results by the digest of their inputs. A study.Store is one.
type Cache interface {
	Results(ctx context.Context, step string, digests []string) (map[string][]byte, error)
	PutResults(ctx context.Context, add []study.Result, keep map[string]map[string]bool) error
}

// Memory is a cache that lives as long as the program. The zero value is empty and ready.
type Memory struct {
	mu sync.Mutex
	m  map[string]map[string][]byte
}

// Results implements Cache.
func (c *Memory) Results(_ context.Context, step string, digests []string) (map[string][]byte, error) {
	c.mu.Lock()
	defer c.mu.Unlock()
	out := map[string][]byte{}
	for _, d := range digests {
		if b, ok := c.m[step][d]; ok {
			out[d] = b
		}
	}
	return out, nil
}

// PutResults implements Cache.
func (c *Memory) PutResults(_ context.Context, add []study.Result, keep map[string]map[string]bool) error {
	c.mu.Lock()
	defer c.mu.Unlock()
	if c.m == nil {
		c.m = map[string]map[string][]byte{}
	}
	for step, wanted := range keep {
		for d := range c.m[step] {
			if !wanted[d] {
				delete(c.m[step], d)
			}
		}
	}
	for _, r := range add {
		if c.m[r.Step] == nil {
			c.m[r.Step] = map[string][]byte{}
		}
		c.m[r.Step][r.Digest] = r.Data
	}
	return nil
}

// writers are kept because making one clears more memory than a result has.
var writers = sync.Pool{New: func() any {
	w, err := flate.NewWriter(nil, flate.BestSpeed)
	if err != nil {
		panic(err) // the level is one that the library knows
	}
	return w
}}

// pack writes a result as compressed JSON. JSON keeps every finite float64 to its last bit.
func pack(v any) ([]byte, error) {
	b, _, err := packed(v)
	return b, err
}

// packed also gives the digest of the JSON, which is what a result is known by.
func packed(v any) ([]byte, digest, error) {
	j, err := json.Marshal(v)
	if err != nil {
		return nil, digest{}, err
	}
	var b bytes.Buffer
	w := writers.Get().(*flate.Writer)
	defer writers.Put(w)
	w.Reset(&b)
	if _, err := w.Write(j); err != nil {
		return nil, digest{}, err
	}
	if err := w.Close(); err != nil {
		return nil, digest{}, err
	}
	return b.Bytes(), sha256.Sum256(j), nil
}

func unpack(data []byte, v any) error {
	_, err := unpacked(data, v)
	return err
}

func unpacked(data []byte, v any) (digest, error) {
	b, err := io.ReadAll(flate.NewReader(bytes.NewReader(data)))
	if err != nil {
		return digest{}, fmt.Errorf("stored result: %w", err)
	}
	return sha256.Sum256(b), json.Unmarshal(b, v)
}

type digest = [sha256.Size]byte
