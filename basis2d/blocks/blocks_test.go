package blocks

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// Property tests draw the same cases in every run unless -rapid.seed says otherwise.
func init() { flag.Set("rapid.seed", "20250101") }

// TestBlocksCoverEveryRowOnce draws numbers of rows, with those around a block's edge.
func TestBlocksCoverEveryRowOnce(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.OneOf(rapid.IntRange(0, 5*Size), rapid.SampledFrom([]int{0, 1, Size - 1, Size, Size + 1, 2 * Size})).Draw(t, "rows")
		next := 0
		for b := 0; b < Count(n); b++ {
			from, to := Range(b, n)
			if from != next || to <= from || to-from > Size {
				t.Fatalf("block %d of %d rows is [%d, %d)", b, n, from, to)
			}
			next = to
		}
		if next != n {
			t.Fatalf("blocks end at row %d of %d", next, n)
		}
	})
}

// TestSumDoesNotDependOnWorkers adds values of very different size, so that any other order shows in the bits.
func TestSumDoesNotDependOnWorkers(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 1))
	for _, n := range []int{0, 1, Size, Size + 1, 7 * Size, 101*Size + 13} {
		v := make([]float64, n)
		for i := range v {
			v[i] = random.NormFloat64() * math.Exp(20*random.NormFloat64())
		}
		sum := func(workers int) []float64 {
			dst := []float64{0.25, -1, 0}
			err := Sum(context.Background(), workers, n, dst, func(_, from, to int, acc []float64) error {
				for i := from; i < to; i++ {
					if i%3 == 0 {
						time.Sleep(time.Nanosecond) // shake up the order of completion
					}
					acc[0] += v[i]
					acc[1] += v[i] * v[i]
					acc[2]++
				}
				return nil
			})
			if err != nil {
				t.Fatal(err)
			}
			return dst
		}
		one := sum(1)
		if one[2] != float64(n) {
			t.Fatalf("%d rows: visited %g", n, one[2])
		}
		for _, workers := range []int{1, 2, 7, 0} {
			for j, got := range sum(workers) {
				if math.Float64bits(got) != math.Float64bits(one[j]) {
					t.Errorf("%d rows, %d workers: sum %d is %v, with one worker %v", n, workers, j, got, one[j])
				}
			}
		}
	}
}

// TestSumAddsToWhatIsThere and keeps it on an error.
func TestSumAddsToWhatIsThere(t *testing.T) {
	wrong := errors.New("row 500")
	dst := []float64{3}
	err := Sum(context.Background(), 2, 1000, dst, func(_, from, to int, acc []float64) error {
		acc[0] += float64(to - from)
		if from <= 500 && 500 < to {
			return wrong
		}
		return nil
	})
	if err != wrong || dst[0] != 3 {
		t.Errorf("error %v, sum %g", err, dst[0])
	}
}

func TestDoVisitsEveryTaskOnceWithinItsWorkers(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		tasks, workers := rapid.IntRange(0, 300).Draw(t, "tasks"), rapid.IntRange(1, 9).Draw(t, "workers")
		visits := make([]atomic.Int32, tasks)
		busy := make([]atomic.Bool, workers)
		err := Do(context.Background(), workers, tasks, func(worker, task int) error {
			if worker < 0 || worker >= workers {
				return fmt.Errorf("worker %d of %d", worker, workers)
			}
			if !busy[worker].CompareAndSwap(false, true) { // scratch space belongs to one goroutine
				return fmt.Errorf("worker %d does two tasks at once", worker)
			}
			visits[task].Add(1)
			busy[worker].Store(false)
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
		for k := range visits {
			if v := visits[k].Load(); v != 1 {
				t.Fatalf("task %d was done %d times", k, v)
			}
		}
	})
}

// TestPanicComesBack as an error with the value and the place where it happened, whichever goroutine it was in.
func TestPanicComesBack(t *testing.T) {
	for _, workers := range []int{1, 2, 7} {
		err := Do(context.Background(), workers, 50, func(_, task int) error {
			if task == 31 {
				var none []float64
				_ = none[task]
			}
			return nil
		})
		var p *PanicError
		if !errors.As(err, &p) {
			t.Fatalf("%d workers: %v is no PanicError", workers, err)
		}
		if !strings.Contains(p.Error(), "internal error: runtime error: index out of range [31]") || !strings.Contains(string(p.Stack), "TestPanicComesBack") {
			t.Errorf("%d workers: says %q, from\n%s", workers, p, p.Stack)
		}
		err = Sum(context.Background(), workers, 5*Size, []float64{0}, func(int, int, int, []float64) error { panic("no") })
		if !errors.As(err, &p) || p.Value != "no" {
			t.Errorf("%d workers: a panic in a sum comes back as %v", workers, err)
		}
	}
}

// TestFirstErrorInTaskOrder lets the later task fail first.
func TestFirstErrorInTaskOrder(t *testing.T) {
	for _, workers := range []int{1, 2, 7} {
		failed := make(chan struct{})
		err := Do(context.Background(), workers, 2, func(_, task int) error {
			if task == 0 {
				if workers > 1 {
					<-failed
				}
				return errors.New("task 0")
			}
			close(failed)
			return errors.New("task 1")
		})
		if err == nil || err.Error() != "task 0" {
			t.Errorf("%d workers: %v", workers, err)
		}
	}
}

func TestAnErrorStopsTheRest(t *testing.T) {
	for _, workers := range []int{1, 2} {
		var done atomic.Int32
		err := Do(context.Background(), workers, 100_000, func(_, task int) error {
			done.Add(1)
			if task == 3 {
				return errors.New("no more")
			}
			time.Sleep(time.Microsecond)
			return nil
		})
		if err == nil || done.Load() > 50_000 {
			t.Errorf("%d workers: error %v after %d tasks", workers, err, done.Load())
		}
	}
}

func TestCancelStops(t *testing.T) {
	for _, workers := range []int{1, 2, 7} {
		ctx, cancel := context.WithCancel(context.Background())
		var done atomic.Int32
		err := Do(ctx, workers, 100_000, func(_, task int) error {
			switch n := done.Add(1); {
			case n == 5:
				cancel()
			case n > 5: // on another worker, while the fifth is on its way to cancel
				<-ctx.Done()
			}
			return nil
		})
		if !errors.Is(err, context.Canceled) || done.Load() > 5+int32(workers) {
			t.Errorf("%d workers: %v after %d tasks", workers, err, done.Load())
		}
		dst := []float64{0}
		err = Sum(ctx, workers, 10*Size, dst, func(int, int, int, []float64) error {
			t.Error("a block of a sum that was cancelled before it began")
			return nil
		})
		if !errors.Is(err, context.Canceled) {
			t.Errorf("%d workers: a cancelled sum says %v", workers, err)
		}
	}
	// Cancelled within a run of blocks: the run's remaining blocks are left.
	ctx, cancel := context.WithCancel(context.Background())
	visited := 0
	err := Sum(ctx, 1, 1000*Size, []float64{0}, func(int, int, int, []float64) error { visited++; cancel(); return nil })
	if !errors.Is(err, context.Canceled) || visited != 1 {
		t.Errorf("%v after %d blocks", err, visited)
	}
}

func TestNoTasks(t *testing.T) {
	if err := Do(context.Background(), 4, 0, func(int, int) error { return errors.New("called") }); err != nil {
		t.Error(err)
	}
	if Workers(3) != 3 || Workers(0) < 1 || Workers(-1) < 1 {
		t.Errorf("workers: %d, %d, %d", Workers(3), Workers(0), Workers(-1))
	}
}
