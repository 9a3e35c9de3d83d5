#!/bin/bash
# Joins the shards of this sweep into its report; refuses while any is missing.
module load ebbline/1.0
export NOTE="a b"
exec apptainer exec image.sif '/opt/o'\''neil'\''s programs/ebbline' merge '/scratch/it'\''s a job' --workers 3
