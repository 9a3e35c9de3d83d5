#!/bin/bash
# Runs one shard of this sweep: the one that its argument names, or that of a
# task of a Slurm array. What is finished of it is kept and not run again.
shard=${1:-${SLURM_ARRAY_TASK_ID:?name a shard, 1 to 12}}
module load ebbline/1.0
export NOTE="a b"
exec apptainer exec image.sif '/opt/o'\''neil'\''s programs/ebbline' sweep --slurm '/scratch/it'\''s a job' --shard "$shard" --workers 3
