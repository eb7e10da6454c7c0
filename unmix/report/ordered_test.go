package report

import (
	"context"
	"errors"
	"testing"
	"time"

	"go.uber.org/goleak"
)

func TestOrderedKeepsOrder(t *testing.T) {
	defer goleak.VerifyNone(t)
	for _, workers := range []int{1, 3, 8} {
		var got []int
		err := ordered(context.Background(), workers, 50, func(i int) (int, error) {
			time.Sleep(time.Duration((i*7)%5) * 100 * time.Microsecond)
			return i * i, nil
		}, func(i, v int) error {
			if v != i*i {
				t.Errorf("answer %d is %d", i, v)
			}
			got = append(got, v)
			return nil
		})
		if err != nil || len(got) != 50 {
			t.Errorf("%d workers: %d answers, %v", workers, len(got), err)
		}
	}
}

func TestOrderedStops(t *testing.T) {
	defer goleak.VerifyNone(t)
	bad := errors.New("bad")
	err := ordered(context.Background(), 4, 1000, func(i int) (int, error) {
		if i == 10 {
			return 0, bad
		}
		return i, nil
	}, func(i, _ int) error {
		if i >= 10 {
			t.Errorf("collected %d after the error", i)
		}
		return nil
	})
	if err != bad {
		t.Errorf("error %v", err)
	}
	ctx, stop := context.WithCancel(context.Background())
	err = ordered(ctx, 4, 1000, func(i int) (int, error) { return i, nil }, func(i, _ int) error {
		if i == 5 {
			stop()
		}
		return nil
	})
	if !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled run gave %v", err)
	}
}
