package run

import (
	"context"
	"fmt"
	"runtime/debug"
	"sync"
	"sync/atomic"
)

// Progress is told how far a step is. It is called from several goroutines, never at the same time.
type Progress func(step string, done, total int)

// forEach calls work for every index below n on up to cores goroutines. Each goroutine has a resource
// of its own from open, closed at its end. Results belong into slots by index, so that their order
// does not depend on timing. It stops at the first error, which is that of the lowest index among
// those found, or when the context ends. A panic in work becomes an error that names the index.
func forEach[R any](ctx context.Context, cores, n int, open func() (R, error), closeR func(R), work func(r R, i int) error, progress func(done int)) error {
	if n == 0 {
		return nil
	}
	if cores < 1 {
		cores = 1
	}
	if cores > n {
		cores = n
	}
	var next atomic.Int64
	var mu sync.Mutex
	var firstErr error
	errAt := n
	done := 0
	fail := func(i int, err error) {
		mu.Lock()
		if i < errAt {
			errAt, firstErr = i, err
		}
		mu.Unlock()
	}
	failed := func() bool { mu.Lock(); defer mu.Unlock(); return firstErr != nil }
	safely := func(r R, i int) (err error) {
		defer func() {
			if p := recover(); p != nil {
				err = fmt.Errorf("fault in item %d: %v\n%s", i, p, debug.Stack())
			}
		}()
		return work(r, i)
	}
	var wg sync.WaitGroup
	for range cores {
		wg.Add(1)
		go func() {
			defer wg.Done()
			r, err := open()
			if err != nil {
				fail(-1, err)
				return
			}
			defer closeR(r)
			for {
				i := int(next.Add(1)) - 1
				if i >= n || ctx.Err() != nil || failed() {
					return
				}
				if err := safely(r, i); err != nil {
					fail(i, err)
					return
				}
				if progress != nil {
					mu.Lock()
					done++
					progress(done)
					mu.Unlock()
				}
			}
		}()
	}
	wg.Wait()
	if firstErr != nil {
		return firstErr
	}
	return ctx.Err()
}
