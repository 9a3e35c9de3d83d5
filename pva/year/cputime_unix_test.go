//go:build unix

package year

import (
	"syscall"
	"time"
)

// cpuTime is the processor time of this process, which a busy machine does not
// stretch as it stretches the time on the wall.
func cpuTime() time.Duration {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		return 0
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}
