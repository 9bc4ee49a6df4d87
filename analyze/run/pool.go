package run

import (
	"context"
	"sync"
	"sync/atomic"
)

// parallel calls do(0) .. do(n-1) on the given number of goroutines and
// returns when all are done, or ctx is. Results belong into slices by index:
// the order of the calls must not matter. A panic in one of them is raised
// again here.
func parallel(ctx context.Context, workers, n int, do func(i int)) error {
	workers = max(1, min(workers, n))
	var (
		next   atomic.Int64
		wg     sync.WaitGroup
		once   sync.Once
		failed any
	)
	for range workers {
		wg.Go(func() {
			defer func() {
				if r := recover(); r != nil {
					once.Do(func() { failed = r })
					next.Store(int64(n))
				}
			}()
			for ctx.Err() == nil {
				i := int(next.Add(1)) - 1
				if i >= n {
					return
				}
				do(i)
			}
		})
	}
	wg.Wait()
	if failed != nil {
		panic(failed)
	}
	return ctx.Err()
}
