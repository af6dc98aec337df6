// Package blocks runs work over rows in parallel so that the answer does not depend on the number of workers.
//
// Rows are cut into blocks of a fixed size; each block fills its own result, and results are combined in block order
// by the caller. It is the only place in the program that starts compute goroutines: a panic in one of them comes back
// to the caller as an error, and a cancelled context stops the hand-out of further blocks.
package blocks

import (
	"context"
	"fmt"
	"runtime"
	"runtime/debug"
	"sync"
	"sync/atomic"
)

// Size is the number of rows in a block. Small enough for a block of basis rows to stay in cache, large enough for
// matrix kernels to reach their speed (measured: 128 to 256).
const Size = 192

// Count returns the number of blocks that n rows make.
func Count(n int) int { return (n + Size - 1) / Size }

// Range returns the rows [from, to) of block b out of n rows.
func Range(b, n int) (from, to int) { return b * Size, min((b+1)*Size, n) }

// Workers returns the number of goroutines that w asks for: w itself, or one a processor if w is not positive.
func Workers(w int) int {
	if w > 0 {
		return w
	}
	return runtime.GOMAXPROCS(0)
}

// PanicError is a panic in a compute goroutine, returned to the caller of Do.
type PanicError struct {
	Value any
	Stack []byte
}

func (e *PanicError) Error() string { return fmt.Sprintf("internal error: %v", e.Value) }

// Do calls work(worker, task) once for every task in [0, tasks), on at most workers goroutines; worker in [0, workers)
// tells which one, so that it may keep scratch space. Order of calls is not fixed: work writes only to its own task's
// result. Do returns the first task's error in task order, a *PanicError if work panicked, or the context's error.
func Do(ctx context.Context, workers, tasks int, work func(worker, task int) error) error {
	workers = min(Workers(workers), tasks)
	if workers <= 1 {
		for t := 0; t < tasks; t++ {
			if err := ctx.Err(); err != nil {
				return err
			}
			if err := guarded(work, 0, t); err != nil {
				return err
			}
		}
		return nil
	}
	var (
		next   atomic.Int64
		failed atomic.Bool
		errs   = make([]error, tasks)
		wg     sync.WaitGroup
	)
	for w := 0; w < workers; w++ {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for !failed.Load() && ctx.Err() == nil {
				t := int(next.Add(1)) - 1
				if t >= tasks {
					return
				}
				if errs[t] = guarded(work, w, t); errs[t] != nil {
					failed.Store(true)
				}
			}
		}()
	}
	wg.Wait()
	for _, err := range errs {
		if err != nil {
			return err
		}
	}
	return ctx.Err()
}

// Sum fills parts in parallel and adds them in a fixed order. The tasks are split into a fixed number of runs of
// neighbouring blocks, whatever the number of workers; within a run blocks are added one after the other into that
// run's accumulator of size values, and the runs' accumulators are added to dst in order. So the rounding, and hence
// every byte, is the same for one worker and for many.
func Sum(ctx context.Context, workers, n int, dst []float64, add func(worker, from, to int, acc []float64) error) error {
	runs := min(Count(n), runCount(len(dst)))
	acc := make([][]float64, runs)
	err := Do(ctx, workers, runs, func(worker, r int) error {
		acc[r] = make([]float64, len(dst))
		first, last := r*Count(n)/runs, (r+1)*Count(n)/runs
		for b := first; b < last; b++ {
			if err := ctx.Err(); err != nil {
				return err
			}
			from, to := Range(b, n)
			if err := add(worker, from, to, acc[r]); err != nil {
				return err
			}
		}
		return nil
	})
	if err != nil {
		return err
	}
	for _, a := range acc {
		for i, v := range a {
			dst[i] += v
		}
	}
	return nil
}

// runCount is how many accumulators of size values Sum keeps: enough to share out evenly among the cores of a large
// machine, few enough that accumulators the size of a Gram matrix stay below 64 MiB or four of them.
func runCount(size int) int { return max(4, min(32, 8<<20/max(1, size))) }

func guarded(work func(worker, task int) error, worker, task int) (err error) {
	defer func() {
		if v := recover(); v != nil {
			err = &PanicError{Value: v, Stack: debug.Stack()}
		}
	}()
	return work(worker, task)
}
