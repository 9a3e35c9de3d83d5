package cluster

import (
	"fmt"
	"strings"
)

// Quote writes a word so that a shell takes it as it is.
func Quote(s string) string {
	plain := s != "" && !strings.ContainsFunc(s, func(r rune) bool {
		return !(r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || strings.ContainsRune("/._-+:,@%=", r))
	})
	if plain {
		return s
	}
	return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
}

// options are what a person asked of the cluster, as words for sbatch.
func (s Slurm) options() string {
	out := fmt.Sprintf("--cpus-per-task=%d", max(1, s.Cores))
	for _, one := range []struct{ name, value string }{
		{"partition", s.Partition}, {"account", s.Account}, {"time", s.Time}, {"mem", s.Memory},
	} {
		if one.value != "" {
			out += " " + Quote("--"+one.name+"="+one.value)
		}
	}
	return out
}

// submitScript: everything that sbatch is told stands here, so that shard.sh and
// merge.sh are plain scripts. --chdir keeps the name of the folder as it was
// given, which may be another on a node than what it resolves to here, and a
// relative --output is taken from it. The signal comes to the program itself, as it takes the
// script's place (exec), two minutes before the time is up. The merge is held
// until all tasks have ended well, and taken away if one has not; it looks for
// itself whether all is there.
func (j *Job) submitScript(dir string) string {
	common := `--chdir="$PWD" --open-mode=append \
    --requeue --signal=B:TERM@120 ` + j.Slurm.options()
	return `#!/bin/sh
# Submits this sweep to Slurm: its shards as the tasks of one array, and the
# merge that waits for them. Which shards, the argument says, such as 3,7-9:
# without it all of them, and with "none" the merge alone.
set -eu
cd ` + Quote(dir) + `
shards=${1:-1-` + fmt.Sprint(j.Shards) + `}
set --
if [ "$shards" != none ]; then
  array=$(sbatch --parsable --array="$shards" --job-name=ebbline \
    --output=logs/%a.log ` + common + ` shard.sh)
  array=${array%%;*}
  echo "array $array of shards $shards" | tee -a ` + submittedName + `
  set -- --dependency="afterok:$array" --kill-on-invalid-dep=yes
fi
if merge=$(sbatch --parsable "$@" --job-name=ebbline-merge \
    --output=logs/merge.log ` + common + ` merge.sh); then
  echo "merge ${merge%%;*}" | tee -a ` + submittedName + `
else
  echo "The merge is not submitted. When the shards have ended: sh submit.sh none" >&2
  exit 1
fi
`
}

// before is what stands before the program in a script.
func (s Slurm) before() (lines, exec string) {
	for _, line := range s.Lines {
		lines += line + "\n"
	}
	exec = "exec "
	if s.Prefix != "" {
		exec += s.Prefix + " "
	}
	return lines, exec
}

func (s Slurm) workers() string {
	if s.Workers == 0 {
		return ""
	}
	return fmt.Sprintf(" --workers %d", s.Workers)
}

// shardScript is for bash, whose functions (module is one) come to a job with
// the environment.
func (j *Job) shardScript(dir string) string {
	lines, exec := j.Slurm.before()
	return fmt.Sprintf(`#!/bin/bash
# Runs one shard of this sweep: the one that its argument names, or that of a
# task of a Slurm array. What is finished of it is kept and not run again.
shard=${1:-${SLURM_ARRAY_TASK_ID:?name a shard, 1 to %d}}
%s%s%s sweep --slurm %s --shard "$shard"%s
`, j.Shards, lines, exec, Quote(j.Program), Quote(dir), j.Slurm.workers())
}

func (j *Job) mergeScript(dir string) string {
	lines, exec := j.Slurm.before()
	return fmt.Sprintf(`#!/bin/bash
# Joins the shards of this sweep into its report; refuses while any is missing.
%s%s%s merge %s%s
`, lines, exec, Quote(j.Program), Quote(dir), j.Slurm.workers())
}

// Resubmit is the command that submits what is missing.
func (j *Job) Resubmit(dir string) string {
	return fmt.Sprintf("%s sweep --slurm %s --submit --resume", Quote(j.Program), Quote(dir))
}

// Look is the command that says what is done.
func (j *Job) Look(dir string) string {
	return fmt.Sprintf("%s sweep --status %s", Quote(j.Program), Quote(dir))
}

func (j *Job) readme(dir string) string {
	return fmt.Sprintf("Submit:    %s\nLook:      %s\nResubmit:  %s (only what is missing; once nothing of it is queued)\n", Quote(Script(dir)), j.Look(dir), j.Resubmit(dir))
}
