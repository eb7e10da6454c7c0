package main

import (
	"errors"
	"fmt"
	"syscall"

	"tarnlight/eem"
	"tarnlight/eem/prepare"
)

// openCache gives the job the cache beside its results, OUT.cache. There it lies on
// the same disk, goes where the results go, holds one survey's bottles and no more,
// and is guarded by the lock of the results. With --fresh there is none, and an
// older one is removed.
func (j *job) openCache() {
	if j.fresh {
		prepare.NewCache(j.cacheDir(), "").Clear()
		return
	}
	program, err := prepare.ProgramHash()
	if err != nil { // nobody could say which program made an entry
		return
	}
	j.cache = prepare.NewCache(j.cacheDir(), program)
}

func (j *job) cacheDir() string { return j.out + ".cache" }

// tellCache says how many bottles were taken over, and why none were kept.
func (j *job) tellCache() {
	if j.cache == nil {
		return
	}
	if n := j.cache.Hits(); n > 0 {
		fmt.Fprintf(j.bar, "%s as they were read last; --fresh reads them again\n", eem.Count(n, "unchanged bottle"))
	}
	if err := j.cache.Err(); err != nil {
		fmt.Fprintf(j.bar, "the next run will read all bottles again: %v\n", err)
	}
}

// yieldCache frees the room of the cache when the disk was too full for results.
func (j *job) yieldCache(err error) {
	if j.cache != nil && errors.Is(err, syscall.ENOSPC) {
		j.cache.Clear()
	}
}
