//go:build !unix

package year

import "time"

var begun = time.Now()

func cpuTime() time.Duration { return time.Since(begun) }
