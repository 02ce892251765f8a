//go:build !unix

package kernel

import "time"

// processorTime is not known here.
func processorTime() (time.Duration, bool) { return 0, false }
