package main

import (
	"context"
	"sync"

	"cistern/policy"
)

// solveAll solves many households side by side, each by itself on one worker. The
// first error, in the order of the households, ends it.
func solveAll(ctx context.Context, households []policy.Household, o policy.Options, workers int, onSolved func(int64)) ([]*policy.Rule, error) {
	ctx, cancel := context.WithCancel(ctx)
	defer cancel()
	rules, errs := make([]*policy.Rule, len(households)), make([]error, len(households))
	next := make(chan int, len(households))
	for i := range households {
		next <- i
	}
	close(next)
	var wg sync.WaitGroup
	for range min(workers, len(households)) {
		wg.Add(1)
		go func() {
			defer wg.Done()
			for i := range next {
				if rules[i], errs[i] = policy.Solve(ctx, households[i], o); errs[i] != nil {
					cancel()
					return
				}
				onSolved(1)
			}
		}()
	}
	wg.Wait()
	return rules, firstError(errs)
}

// firstError prefers an error of its own to one that only says that another
// worker had failed.
func firstError(errs []error) error {
	var first error
	for _, err := range errs {
		if err == nil {
			continue
		}
		if first == nil || isCancelled(first) && !isCancelled(err) {
			first = err
		}
	}
	return first
}
