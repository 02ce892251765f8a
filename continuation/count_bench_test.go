package continuation_test

import (
	"fmt"
	"testing"
	"time"

	"brinkline/continuation"
)

// BenchmarkCount measures what the count of unstable eigenvalues and the detection
// of special points add to a trace with exact derivatives: against the same trace
// without eigenvalues; and with all eigenvalues at every point. proved is the share
// of points at which the inertia theorem served in their place.
func BenchmarkCount(b *testing.B) {
	for _, n := range []int{2, 8, 40} {
		b.Run(fmt.Sprint("n=", n), func(b *testing.B) {
			start := chainStart(b, n, continuation.WithSource("chain", chainSource))
			proved, points := 0, 0
			trace := func(opts ...continuation.FollowOption) time.Duration {
				best := time.Hour
				for range 5 {
					begin := time.Now()
					branch, err := start.Follow("Da", append(opts, continuation.Within(0.02, 0.2), continuation.MaxSteps(150), continuation.Upward())...)
					if err != nil {
						b.Fatal(err)
					}
					best = min(best, time.Since(begin)/time.Duration(branch.Steps()))
					proved, points = 0, len(branch.Points())
					for _, p := range branch.Points() {
						if p.Eigenvalues == nil {
							proved++
						}
					}
				}
				return best
			}
			without := trace(continuation.WithoutEigenvalues())
			all := trace(continuation.WithEigenvalues())
			count := trace()
			for b.Loop() {
				trace()
			}
			b.ReportMetric(float64(count)/float64(without), "count/none")
			b.ReportMetric(float64(all)/float64(without), "all/none")
			b.ReportMetric(float64(proved)/float64(points), "proved")
		})
	}
}
