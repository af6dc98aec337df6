package locks_test

import (
	"errors"
	"sync/atomic"
	"testing"
	"time"

	"drumlin/basis2d/blocks"
	"drumlin/cmd/internal/locks"
)

// TestOneAtATime has many take, share and give back one lock, whose file comes and goes meanwhile: never are two in who
// asked to be alone, and never is one beside those who share.
func TestOneAtATime(t *testing.T) {
	const hold = 100 * time.Microsecond // long enough for others to try
	path := lockFile(t)
	var alone, shared, took, sharedOnes atomic.Int64
	end := time.Now().Add(time.Second)
	err := blocks.Do(t.Context(), 8, 8, func(_, task int) error {
		for n := 0; time.Now().Before(end); n++ {
			switch {
			case n%5 == 4:
				locks.HeldBy(path)
			case (task+n)%3 == 0:
				release, err := locks.TakeShared(path)
				if held := (*locks.Held)(nil); errors.As(err, &held) {
					continue
				} else if err != nil {
					return err
				}
				shared.Add(1)
				sharedOnes.Add(1)
				if alone.Load() != 0 {
					t.Error("one has it alone while another shares it")
				}
				time.Sleep(hold)
				shared.Add(-1)
				release()
			default:
				release, err := locks.Take(path, "a test")
				if held := (*locks.Held)(nil); errors.As(err, &held) {
					continue
				} else if err != nil {
					return err
				}
				took.Add(1)
				if alone.Add(1) != 1 || shared.Load() != 0 {
					t.Error("two have it")
				}
				time.Sleep(hold)
				if shared.Load() != 0 {
					t.Error("one shares it while another has it alone")
				}
				alone.Add(-1)
				release()
			}
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if took.Load() < 20 || sharedOnes.Load() < 20 {
		t.Errorf("only %d and %d came to have it", took.Load(), sharedOnes.Load())
	}
}
