package report

import (
	"context"
	"sync"
)

// ordered does work(0) … work(n−1) on several goroutines and hands the answers to
// collect one by one in order, so that what is made of them does not depend on
// the number of workers. At most 2 answers a worker wait at any time. The first
// error ends it.
func ordered[T any](ctx context.Context, workers, n int, work func(i int) (T, error), collect func(i int, v T) error) error {
	type answer struct {
		v   T
		err error
	}
	ctx, stop := context.WithCancel(ctx)
	var wg sync.WaitGroup
	defer wg.Wait()
	defer stop()
	slots := make(chan chan answer, 2*workers) // in order
	jobs := make(chan func(), workers)
	for range workers {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for job := range jobs {
				job()
			}
		}()
	}
	wg.Add(1)
	go func() {
		defer wg.Done()
		defer close(jobs)
		defer close(slots)
		for i := range n {
			slot := make(chan answer, 1)
			select {
			case <-ctx.Done():
				return
			case slots <- slot:
			}
			jobs <- func() {
				v, err := work(i)
				slot <- answer{v, err}
			}
		}
	}()
	i := 0
	for slot := range slots {
		a := <-slot
		if a.err == nil {
			a.err = ctx.Err()
		}
		if a.err == nil {
			a.err = collect(i, a.v)
		}
		if a.err != nil {
			return a.err
		}
		i++
	}
	return ctx.Err()
}
