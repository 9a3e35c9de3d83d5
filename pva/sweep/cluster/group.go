package cluster

import (
	"math"
	"strconv"
	"strings"
)

// ShardSeconds is how long a shard is meant to last on one slow core for each of
// its cores: long beside the second that a batch system takes to start a task,
// and short beside the hours that it is allowed.
const ShardSeconds = 600

// DefaultMaxArraySize is Slurm's MaxArraySize where a cluster sets no other.
const DefaultMaxArraySize = 1001

// Shards is into how many shards so many units of work are put, which take so
// many seconds of one core together, if each shard has so many cores: each lasts
// about ShardSeconds and has a unit for each core, and the largest number, which
// is that of the last task, stays below maxArraySize.
func Shards(units int, seconds float64, cores, maxArraySize int) int {
	cores = max(1, cores)
	n := math.Ceil(seconds / (ShardSeconds * float64(cores)))
	most := min(units/cores, maxArraySize-1)
	return max(1, int(math.Min(n, float64(most))))
}

// MaxArraySize reads the setting out of what `scontrol show config` prints; the
// default where it says none.
func MaxArraySize(config string) int {
	for line := range strings.Lines(config) {
		name, value, ok := strings.Cut(line, "=")
		if !ok || strings.TrimSpace(name) != "MaxArraySize" {
			continue
		}
		if n, err := strconv.Atoi(strings.TrimSpace(value)); err == nil && n > 1 {
			return n
		}
	}
	return DefaultMaxArraySize
}

// List writes rising numbers as sbatch's --array takes them: "3,7-9".
func List(numbers []int) string {
	var parts []string
	for i := 0; i < len(numbers); i++ {
		from := i
		for i+1 < len(numbers) && numbers[i+1] == numbers[i]+1 {
			i++
		}
		part := strconv.Itoa(numbers[from])
		if i > from {
			part += "-" + strconv.Itoa(numbers[i])
		}
		parts = append(parts, part)
	}
	return strings.Join(parts, ",")
}
