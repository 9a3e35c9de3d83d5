#!/bin/sh
# Submits this sweep to Slurm: its shards as the tasks of one array, and the
# merge that waits for them. Which shards, the argument says, such as 3,7-9:
# without it all of them, and with "none" the merge alone.
set -eu
cd '/scratch/it'\''s a job'
shards=${1:-1-12}
set --
if [ "$shards" != none ]; then
  array=$(sbatch --parsable --array="$shards" --job-name=ebbline \
    --output=logs/%a.log --chdir="$PWD" --open-mode=append \
    --requeue --signal=B:TERM@120 --cpus-per-task=4 --partition=short '--account=marsh & pond' --time=1:30:00 --mem=2G shard.sh)
  array=${array%%;*}
  echo "array $array of shards $shards" | tee -a submitted
  set -- --dependency="afterok:$array" --kill-on-invalid-dep=yes
fi
if merge=$(sbatch --parsable "$@" --job-name=ebbline-merge \
    --output=logs/merge.log --chdir="$PWD" --open-mode=append \
    --requeue --signal=B:TERM@120 --cpus-per-task=4 --partition=short '--account=marsh & pond' --time=1:30:00 --mem=2G merge.sh); then
  echo "merge ${merge%%;*}" | tee -a submitted
else
  echo "The merge is not submitted. When the shards have ended: sh submit.sh none" >&2
  exit 1
fi
